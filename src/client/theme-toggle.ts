/** The header's button switches the theme; the choice is kept in this browser. */
document.getElementById('theme-toggle')?.addEventListener('click', () => {
  const root = document.documentElement;
  const theme = root.dataset['theme'] === 'dark' ? 'light' : 'dark';
  root.dataset['theme'] = theme;
  localStorage.setItem('selvage-theme', theme);
});

export {};
