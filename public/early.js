/* On the sign-in page while its program is still on the way: keeps a press or the Enter key for it. components/people/early-form.ts takes it over. */
(function () {
  var root = document.querySelector('#root[data-early]');
  var form = root && root.querySelector('form');
  var button = form && form.querySelector('button');
  if (!button) return;
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
