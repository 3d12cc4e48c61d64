// Sets the theme before the first paint: the person's choice, else the system's.
(() => {
  const query = matchMedia('(prefers-color-scheme: dark)');
  const apply = () => {
    const chosen = localStorage.getItem('selvage-theme');
    document.documentElement.dataset.theme = chosen === 'dark' || chosen === 'light' ? chosen : query.matches ? 'dark' : 'light';
  };
  try {
    apply();
    query.addEventListener('change', apply);
  } catch {
    document.documentElement.dataset.theme = query.matches ? 'dark' : 'light';
  }
})();
