(function () {
  "use strict";
  // A link to a fold-out unfolds it; browsers do so by themselves only for what lies within.
  function unfold(hash) {
    var named = hash.length > 1 && document.getElementById(hash.slice(1));
    if (named && named.tagName === "DETAILS") named.open = true;
  }
  document.addEventListener("click", function (event) {
    // The second press on the same link changes no address, so that it is not enough to watch it.
    var link = event.target.closest && event.target.closest("a[href^='#ready-']");
    if (link) unfold(link.hash);
  });
  window.addEventListener("hashchange", function () { unfold(location.hash); });
  unfold(location.hash);
})();
