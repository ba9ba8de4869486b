// What the pictures on the page share: the numbers, how they are written, and how supports and pulls are drawn.
var page = (function () {
  "use strict";
  var data = JSON.parse(document.getElementById("run-data").textContent);
  var INK = "#1d2733", MUTED = "#5d6a78", ALARM = "#b3261e";

  // Three digits, without exponent.
  function digits(value) {
    var size = Math.abs(value);
    if (size === 0) return "0";
    return value.toFixed(Math.max(0, Math.min(6, 2 - Math.floor(Math.log10(size)))));
  }
  function shade(share) { return data.scale.colours[Math.round(64 * Math.min(1, Math.max(0, share)))]; }
  function tensionColour(kn) {
    var scale = data.scale, size = Math.abs(kn);
    if (scale.log) return shade(Math.log(Math.max(size, scale.low) / scale.low) / Math.log(scale.high / scale.low));
    return shade(size / scale.high);
  }

  // A canvas as sharp as the screen; returns its context and size.
  function sharpen(canvas) {
    var ratio = window.devicePixelRatio || 1, wide = canvas.clientWidth, high = canvas.clientHeight;
    if (canvas.width !== Math.round(wide * ratio) || canvas.height !== Math.round(high * ratio)) {
      canvas.width = Math.round(wide * ratio);
      canvas.height = Math.round(high * ratio);
    }
    var context = canvas.getContext("2d");
    context.setTransform(ratio, 0, 0, ratio, 0, 0);
    context.clearRect(0, 0, wide, high);
    return { context: context, wide: wide, high: high };
  }
  function label(context, text, x, y, ink, where) {
    context.font = "600 12px system-ui, 'DejaVu Sans', sans-serif";
    context.textAlign = where || "center";
    context.lineWidth = 4; context.lineJoin = "round"; context.strokeStyle = "rgba(255,255,255,.9)"; context.setLineDash([]);
    context.strokeText(text, x, y);
    context.fillStyle = ink;
    context.fillText(text, x, y);
  }

  // Many supports are drawn small, and the arrows of a long row of them would be a hedge: then the largest pulls have theirs.
  var ARROWS = 40, half = data.supports.length > ARROWS ? 2.5 : 5;
  function supports(context, seen) {
    context.setLineDash([]);
    data.supports.forEach(function (n) {
      context.fillStyle = "#fff"; context.strokeStyle = INK; context.lineWidth = half > 3 ? 2 : 1;
      context.beginPath(); context.rect(seen[3 * n] - half, seen[3 * n + 1] - half, 2 * half, 2 * half); context.fill(); context.stroke();
    });
  }
  // Towards the members of each support, to find the side where an arrow is in nobody's way.
  var at = new Map(data.supports.map(function (n) { return [n, []]; }));
  data.segments.forEach(function (part, s) {
    if (at.has(part[0])) at.get(part[0]).push(s);
    if (at.has(part[1])) at.get(part[1]).push(s);
  });
  function towards(seen, n, kn) {
    var sum = [0, 0];
    at.get(n).forEach(function (s) {
      var part = data.segments[s], other = part[0] === n ? part[1] : part[1] === n ? part[0] : -1;
      if (other < 0) return;
      var dx = seen[3 * other] - seen[3 * n], dy = seen[3 * other + 1] - seen[3 * n + 1], size = Math.hypot(dx, dy) || 1;
      sum[0] += Math.abs(kn[s] || 0) * dx / size;
      sum[1] += Math.abs(kn[s] || 0) * dy / size;
    });
    return sum;
  }
  // Pulls (kN) as arrows that point the way each anchor is pulled or pressed, with their numbers. `screen` turns a pull
  // into its direction on the canvas.
  function pulls(context, canvas, seen, kn, list, screen) {
    var sizes = list.map(function (p) { return Math.hypot(p[0], p[1], p[2]); });
    var largest = sizes.map(function (_, i) { return i; }).sort(function (a, b) { return sizes[b] - sizes[a] || a - b; }).slice(0, ARROWS);
    var boxes = [];
    largest.forEach(function (i) {
      var n = data.supports[i], size = sizes[i];
      if (size < 1e-6) return;
      var way = screen(list[i]), dx = way[0] / size, dy = way[1] / size;
      var net = towards(seen, n, kn), x = seen[3 * n], y = seen[3 * n + 1];
      var pressed = dx * net[0] + dy * net[1] < 0, side = pressed ? 1 : -1;
      var near = [x + side * 9 * dx, y + side * 9 * dy], far = [x + side * 46 * dx, y + side * 46 * dy];
      var head = pressed ? far : near, tail = pressed ? near : far;
      context.strokeStyle = INK; context.fillStyle = INK; context.lineWidth = 1.8; context.setLineDash([]);
      context.beginPath(); context.moveTo(tail[0], tail[1]); context.lineTo(head[0] - 5 * dx, head[1] - 5 * dy); context.stroke();
      context.beginPath(); context.moveTo(head[0], head[1]);
      context.lineTo(head[0] - 10 * dx - 4 * dy, head[1] - 10 * dy + 4 * dx);
      context.lineTo(head[0] - 10 * dx + 4 * dy, head[1] - 10 * dy - 4 * dx);
      context.closePath(); context.fill();
      // A number keeps to the canvas, and off the numbers of larger pulls.
      var out = side * dx, text = digits(size) + " kN" + (Math.hypot(dx, dy) < 0.3 ? list[i][2] > 0 ? " up" : " down" : ""), wide = 7.2 * text.length;
      var middle = x + side * 54 * dx + (out > 0.4 ? wide / 2 : out < -0.4 ? -wide / 2 : 0), low = y + side * 60 * dy + 4;
      middle = Math.max(wide / 2 + 3, Math.min(canvas.clientWidth - wide / 2 - 3, middle));
      low = Math.max(14, Math.min(canvas.clientHeight - 5, low));
      var free = boxes.every(function (box) { return Math.abs(box[0] - middle) > (box[2] + wide) / 2 || Math.abs(box[1] - low) > 14; });
      if (!free) return;
      boxes.push([middle, low, wide]);
      label(context, text, middle, low, INK, "center");
    });
    return boxes;
  }
  // Where a force points, in words instead of signs.
  function way(p) {
    var size = Math.hypot(p[0], p[1], p[2]), words = [];
    if (Math.abs(p[2]) > 0.02 * size) words.push(digits(Math.abs(p[2])) + (p[2] > 0 ? " up" : " down"));
    if (Math.hypot(p[0], p[1]) > 0.02 * size) {
      words.push(digits(Math.hypot(p[0], p[1])) + " level at " + Math.round(Math.atan2(p[1], p[0]) * 180 / Math.PI) + "\u00b0");
    }
    return words.join(", ");
  }

  return {
    data: data, INK: INK, MUTED: MUTED, ALARM: ALARM, digits: digits, shade: shade, tensionColour: tensionColour, sharpen: sharpen,
    label: label, supports: supports, pulls: pulls, way: way
  };
})();
