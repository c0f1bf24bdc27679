/* Sets the theme before the first paint. Same key and rule as components/theme/theme-storage.ts. */
(function () {
  var chosen = null;
  try {
    chosen = localStorage.getItem('evenfall.theme');
  } catch (error) {
    chosen = null;
  }
  var known = { dark: '#0b0f15', light: '#f5f2ea', red: '#070000' };
  var light = window.matchMedia && window.matchMedia('(prefers-color-scheme: light)').matches;
  var name = chosen && known[chosen] ? chosen : light ? 'light' : 'dark';
  document.documentElement.className = 'theme-' + name;
  var meta = document.querySelector('meta[name="theme-color"]');
  if (meta) meta.setAttribute('content', known[name]);
})();
