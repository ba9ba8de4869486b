// Pulls of all anchors in one state, which act together, with their sum against that of the loads.
(function () {
  "use strict";
  var data = page.data, choice = document.getElementById("together-state"), body = document.getElementById("together-rows");
  if (!choice || !body) return;
  var ROWS = 400;
  function row(cells, mark) {
    var line = document.createElement("tr");
    if (mark) line.className = mark;
    cells.forEach(function (text, at) {
      var cell = document.createElement("td");
      cell.textContent = text;
      if (at > 0) cell.className = "r";
      line.appendChild(cell);
    });
    body.appendChild(line);
  }
  function show() {
    var now = data.states[+choice.value], sum = [0, 0, 0];
    body.textContent = "";
    document.getElementById("together-words").textContent = now.words ? "Acting: " + now.words + "." : "";
    if (!now.pulls) { row(["no numbers on this page", "", "", "", "", "", ""]); return; }
    now.pulls.forEach(function (p, i) {
      for (var a = 0; a < 3; a++) sum[a] += p[a];
      if (i >= ROWS) return;
      var level = Math.hypot(p[0], p[1]), size = Math.hypot(level, p[2]);
      row([data.nodes[data.supports[i]]].concat(p.map(page.digits), [page.digits(size),
        level > 1e-6 ? Math.round(Math.atan2(p[1], p[0]) * 180 / Math.PI) + "" : "\u2013",
        size > 1e-6 ? Math.round(Math.atan2(p[2], level) * 180 / Math.PI) + "" : "\u2013"]));
    });
    if (now.pulls.length > ROWS) row([now.pulls.length - ROWS + " more anchors in anchors.csv", "", "", "", "", "", ""]);
    row(["sum of the pulls"].concat(sum.map(clean), ["", "", ""]), "total");
    row(["sum of the loads"].concat(now.loads.map(clean), ["", "", ""]), "total");
  }
  // Sums of rounded numbers: what is left of zero is no force.
  function clean(value) { return page.digits(Math.abs(value) < 5e-4 * data.pullScale ? 0 : value); }
  choice.addEventListener("change", show);
  show();
})();
