/*
 * On the sign-in page while its program is still on the way. The program is fetched when the type is there, so that the words do not wait behind
 * it on a slow line; a press or the Enter key is kept for it, and components/people/early-form.ts takes it over.
 */
(function () {
  var root = document.querySelector('#root[data-early]');
  var form = root && root.querySelector('form');
  var button = form && form.querySelector('button');
  if (!button) return;
  function fetchProgram() {
    var script = document.createElement('script');
    script.src = root.getAttribute('data-early');
    document.body.appendChild(script);
  }
  document.fonts.load('15px "Atkinson Hyperlegible Next"').then(fetchProgram, fetchProgram);
  function keep(event) {
    event.preventDefault();
    root.setAttribute('data-pressed', '');
    button.setAttribute('aria-busy', 'true');
    button.classList.add('opacity-50');
  }
  form.addEventListener('submit', keep);
  button.addEventListener('click', keep);
  form.addEventListener('keydown', function (event) {
    if (event.key === 'Enter' && event.target.type === 'password') keep(event);
  });
})();
