/* On the page shown where the server does not answer: asks whether it does again, and then opens the page that was wanted. Sends nothing else. */
(function () {
  var everyMs = 3000;
  var word = document.querySelector('[role="status"]');
  var asking = false;
  function ask(byHand) {
    if (asking) return;
    asking = true;
    var away = new AbortController();
    var timer = setTimeout(function () {
      away.abort();
    }, everyMs);
    fetch('/api/health', { cache: 'no-store', signal: away.signal })
      .then(function (response) {
        return response.json();
      })
      .then(
        function (said) {
          // Only the server itself says when it is; a sign-in page of the network on the way does not.
          if (typeof said.serverAt === 'string' || said.code === 'database-away') location.reload();
          else if (byHand) word.textContent = 'Something answers, but it is not the lab’s server.';
        },
        function () {
          if (byHand) word.textContent = 'Still no answer. Asked again every 3 s.';
        },
      )
      .finally(function () {
        clearTimeout(timer);
        asking = false;
      });
  }
  document.getElementById('again').addEventListener('click', function () {
    word.textContent = 'Asking …';
    ask(true);
  });
  setInterval(ask, everyMs);
})();
