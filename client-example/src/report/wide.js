// Where to find what: links to the sections.
(function () {
  "use strict";
  var list = document.getElementById("contents");
  if (!list) return;
  document.querySelectorAll("section[id] > h2").forEach(function (title) {
    var link = document.createElement("a");
    link.href = "#" + title.parentNode.id;
    link.textContent = title.textContent;
    list.appendChild(link);
  });
})();

// Long tables show their first rows, until asked for all.
(function () {
  "use strict";
  var SHOWN = 25;
  document.querySelectorAll("section table").forEach(function (table) {
    var rows = table.tBodies.length ? table.tBodies[0].rows : [];
    if (rows.length <= SHOWN + 5 || table.tBodies[0].id) return;
    var button = document.createElement("button");
    button.type = "button";
    button.className = "unfold";
    button.textContent = "show all " + rows.length + " rows";
    table.classList.add("folded");
    for (var i = SHOWN; i < rows.length; i++) rows[i].classList.add("more");
    button.addEventListener("click", function () {
      var folded = table.classList.toggle("folded");
      button.textContent = folded ? "show all " + rows.length + " rows" : "show the first " + SHOWN + " rows";
    });
    table.parentNode.parentNode.insertBefore(button, table.parentNode.nextSibling);
  });
})();

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
