// A section along a rope that the reader picks, in the reference state and in up to three cases.
(function () {
  "use strict";
  var data = page.data, digits = page.digits, drawing = document.getElementById("cut");
  if (!drawing) return;
  var rope = document.getElementById("cut-rope"), times = document.getElementById("cut-times"), words = document.getElementById("cut-words");
  var cases = [1, 2, 3].map(function (number) { return document.getElementById("cut-case-" + number); });
  var LOOKS = [["#31688e", ""], ["#c2571a", "7 3"], ["#7a3e9d", "2 3"]];
  var LEFT = 70, RIGHT = 960, SHAPE = 230, ROW = 92, GAP = 34;

  // Nodes along a rope, from its segments in path order.
  function path(member) {
    var nodes = [];
    data.segments.forEach(function (part) {
      if (part[2] !== member) return;
      if (!nodes.length) nodes.push(part[0]);
      nodes.push(part[1]);
    });
    return nodes;
  }
  function put(name, attributes, text) {
    var element = document.createElementNS("http://www.w3.org/2000/svg", name);
    Object.keys(attributes).forEach(function (key) { element.setAttribute(key, attributes[key]); });
    if (text !== undefined) element.textContent = text;
    drawing.appendChild(element);
  }
  function steps(low, high, parts) {
    var rough = Math.max((high - low) / parts, 1e-9), decade = Math.pow(10, Math.floor(Math.log10(rough)));
    var step = [5, 2, 1].map(function (d) { return d * decade; }).find(function (s) { return s <= 1.5 * rough; }) || decade, list = [];
    for (var k = Math.ceil(low / step - 1e-9); k * step <= high + 1e-9 * step; k++) list.push(+(k * step).toPrecision(6));
    return list;
  }
  function polyline(xs, ys, look, wide) {
    var points = xs.map(function (x, i) { return x.toFixed(1) + "," + ys[i].toFixed(1); }).join(" ");
    put("polyline", { points: points, fill: "none", stroke: look[0], "stroke-width": wide, "stroke-dasharray": look[1] });
  }
  // A strip with its scale on the left; returns the height on the sheet of a value.
  function strip(top, high_px, low, high, title) {
    var y = function (value) { return top + high_px * (high - value) / (high - low); };
    steps(low, high, high_px > 150 ? 5 : 3).forEach(function (tick) {
      put("path", { d: "M" + LEFT + " " + y(tick) + "H" + RIGHT, stroke: tick === 0 && low < 0 ? "#8a949e" : "#d4dae0" });
      put("text", { x: LEFT - 8, y: y(tick) + 4, "text-anchor": "end", "font-size": 12 }, String(tick));
    });
    put("text", { transform: "translate(18 " + (top + high_px / 2) + ") rotate(-90)", "text-anchor": "middle", "font-size": 12, fill: page.MUTED }, title);
    return y;
  }
  function span(lists) {
    var low = Infinity, high = -Infinity;
    lists.forEach(function (list) { list.forEach(function (value) { low = Math.min(low, value); high = Math.max(high, value); }); });
    return [low, high];
  }

  function show() {
    var nodes = path(+rope.value), factor = +times.value, at = function (n, a) { return data.reference[3 * n + a]; };
    drawing.textContent = "";
    var way = [0];
    for (var i = 1; i < nodes.length; i++) way.push(way[i - 1] + Math.hypot(at(nodes[i], 0) - at(nodes[i - 1], 0), at(nodes[i], 1) - at(nodes[i - 1], 1)));
    var end = way[way.length - 1];
    if (!(end > 1e-6)) { words.textContent = "This rope stands upright: it has no section of this kind."; return; }
    var picked = [], told = [];
    cases.forEach(function (choice, number) {
      var state = choice.value === "" ? null : data.states[+choice.value];
      if (!state) return;
      if (!state.moves) { told.push(state.id + ": no numbers to draw"); return; }
      picked.push({ state: state, look: LOOKS[number] });
    });
    var x = way.map(function (w) { return LEFT + w / end * (RIGHT - LEFT); });
    var rest = nodes.map(function (n) { return at(n, 2); });
    var heights = picked.map(function (one) { return nodes.map(function (n) { return at(n, 2) + factor * one.state.moves[3 * n + 2]; }); });
    var moved = picked.map(function (one) {
      return nodes.map(function (n) { return 1000 * Math.hypot(one.state.moves[3 * n], one.state.moves[3 * n + 1], one.state.moves[3 * n + 2]); });
    });
    // Falls are those of the true shape, never of the enlarged one; towards the end of the rope negative.
    var falls = [null].concat(picked).map(function (one) {
      return nodes.slice(1).map(function (n, i) {
        var place = function (m, a) { return at(m, a) + (one ? one.state.moves[3 * m + a] : 0); }, m = nodes[i];
        var level = Math.hypot(place(n, 0) - place(m, 0), place(n, 1) - place(m, 1));
        return level > 1e-9 ? 100 * (place(n, 2) - place(m, 2)) / level : 0;
      });
    });

    var top = 14, bounds = span([rest].concat(heights)), room = Math.max(0.06 * (bounds[1] - bounds[0]), 0.05);
    var y = strip(top, SHAPE, bounds[0] - room, bounds[1] + room, "height (m)");
    polyline(x, rest.map(y), [page.INK, ""], 2.4);
    picked.forEach(function (one, k) { polyline(x, heights[k].map(y), one.look, 1.9); });
    [rest].concat(heights).forEach(function (list, k) {
      for (var i = 1; i + 1 < list.length; i++) {
        if (list[i] >= list[i - 1] || list[i] >= list[i + 1]) continue;
        put("path", { d: "M" + (x[i] - 5) + " " + (y(list[i]) + 13) + "h10l-5 -8z", fill: k ? picked[k - 1].look[0] : page.INK });
      }
    });
    top += SHAPE + GAP;
    var most = Math.max(1e-3, span(moved.concat([[0]]))[1]), up = strip(top, ROW, 0, most, "moved (mm)");
    picked.forEach(function (one, k) { polyline(x, moved[k].map(up), one.look, 1.9); });
    top += ROW + GAP;
    var slopes = span(falls.concat([[0]])), rim = Math.max(0.05 * (slopes[1] - slopes[0]), 0.5);
    var side = strip(top, ROW, slopes[0] - rim, slopes[1] + rim, "fall (%)");
    falls.forEach(function (list, k) {
      var xs = [], ys = [];
      list.forEach(function (value, i) { xs.push(x[i], x[i + 1]); ys.push(side(value), side(value)); });
      polyline(xs, ys, k ? picked[k - 1].look : [page.INK, ""], k ? 1.9 : 2.2);
    });
    top += ROW;
    steps(0, end, 8).forEach(function (tick) {
      var place = LEFT + tick / end * (RIGHT - LEFT);
      put("path", { d: "M" + place + " " + top + "v5", stroke: page.MUTED });
      put("text", { x: place, y: top + 19, "text-anchor": "middle", "font-size": 12 }, String(tick));
    });
    put("text", { x: RIGHT, y: top + 36, "text-anchor": "end", "font-size": 12, fill: page.MUTED },
      "way in plan from " + data.nodes[nodes[0]] + " (m), in the reference state");
    var stretch = (SHAPE / (bounds[1] - bounds[0] + 2 * room)) / ((RIGHT - LEFT) / end);
    told.unshift("Heights drawn " + digits(stretch) + " times the lengths, movements " + (factor === 1 ? "to the scale of heights" : factor + " times larger than that") + ".");
    picked.forEach(function (one, k) {
      var best = moved[k].indexOf(Math.max.apply(null, moved[k])), flat = falls[k + 1].map(Math.abs);
      told.push(one.state.id + ": moves up to " + digits(moved[k][best]) + " mm (" + data.nodes[nodes[best]] + "), least fall " + digits(Math.min.apply(null, flat)) + " %.");
    });
    told.push("Triangles: low points along the rope. Fall: of each segment, rising towards the end of the rope positive, never enlarged.");
    words.textContent = told.join(" ");
  }
  [rope, times].concat(cases).forEach(function (choice) { choice.addEventListener("change", show); });
  show();
})();
