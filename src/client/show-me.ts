/** "Show me" buttons of a list of findings fly the page's map to their places, and scroll it into view. */
document.getElementById('findings')?.addEventListener('click', (event) => {
  const button = (event.target as Element).closest<HTMLElement>('[data-place]');
  if (!button) return;
  const place: unknown = JSON.parse(button.dataset['place']!);
  document.getElementById('map')?.scrollIntoView({ block: 'center', behavior: matchMedia('(prefers-reduced-motion: reduce)').matches ? 'auto' : 'smooth' });
  window.dispatchEvent(new CustomEvent('selvage:show', { detail: place }));
});

export {};
