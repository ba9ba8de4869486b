// Tables and drawings that go on to the right say so.
(function () {
  "use strict";
  var wides = Array.from(document.querySelectorAll(".wide")).map(function (wide) {
    var sign = document.createElement("p");
    sign.className = "scrolls";
    sign.textContent = "goes on to the right: scroll sideways \u2192";
    wide.parentNode.insertBefore(sign, wide);
    return [wide, sign];
  });
  function look() {
    wides.forEach(function (pair) {
      var hidden = pair[0].scrollWidth - pair[0].clientWidth;
      pair[0].classList.toggle("cut", hidden - pair[0].scrollLeft > 2);
      pair[1].classList.toggle("on", hidden > 2);
      if (hidden > 2) pair[0].tabIndex = 0; else pair[0].removeAttribute("tabindex");
    });
  }
  wides.forEach(function (pair) { pair[0].addEventListener("scroll", look, { passive: true }); });
  window.addEventListener("resize", look);
  look();
})();
