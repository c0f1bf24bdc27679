/* Sets the theme before the first paint. Same key and rule as components/theme/theme-storage.ts. */
(function () {
  var chosen = null;
  try {
    chosen = localStorage.getItem('evenfall.theme');
  } catch (error) {
    chosen = null;
  }
  var known = { dark: '#0b0f15', light: '#f5f2ea', red: '#070000' };
  var name = chosen && known[chosen] ? chosen : 'dark';
  document.documentElement.className = 'theme-' + name;
  var meta = document.querySelector('meta[name="theme-color"]');
  if (meta) meta.setAttribute('content', known[name]);
})();
