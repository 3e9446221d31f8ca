// Shows one depth at a time. Without it, all depths stand one after another.
(function () {
  var panels = Array.prototype.slice.call(document.querySelectorAll("article.depth"));
  var choices = Array.prototype.slice.call(document.querySelectorAll(".chooser input"));
  function show() {
    choices.forEach(function (choice, index) {
      panels[index].classList.toggle("away", !choice.checked);
    });
  }
  if (panels.length > 1) {
    document.querySelectorAll(".chooser, .chooser-note").forEach(function (part) { part.hidden = false; });
    choices.forEach(function (choice) { choice.addEventListener("change", show); });
    show();
  }
  // On paper nothing can be unfolded.
  var opened = [];
  window.addEventListener("beforeprint", function () {
    opened = Array.prototype.slice.call(document.querySelectorAll("details:not([open])"));
    opened.forEach(function (part) { part.open = true; });
  });
  window.addEventListener("afterprint", function () {
    opened.forEach(function (part) { part.open = false; });
  });
})();
