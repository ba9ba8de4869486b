// The load picture: what one action does to each panel, its sum and where that acts, in plan of the reference state.
(function () {
  "use strict";
  var data = page.data, digits = page.digits, canvas = document.getElementById("loads-plan");
  if (!canvas || !data.actions.length || !data.reference.length) return;
  var choice = document.getElementById("loads-action"), words = document.getElementById("loads-words"), told = document.getElementById("loads-told");
  var NUMBERS = 220, seen = [], under = -1;

  function value(action, p) {
    if (action.pressure.length && action.pressure[p]) return action.pressure[p];
    return action.plan.length ? action.plan[p] || 0 : 0;
  }
  function project() {
    var low = [1e300, 1e300], high = [-1e300, -1e300], n = data.nodes.length;
    for (var i = 0; i < n; i++) for (var a = 0; a < 2; a++) {
      low[a] = Math.min(low[a], data.reference[3 * i + a]);
      high[a] = Math.max(high[a], data.reference[3 * i + a]);
    }
    var wide = canvas.clientWidth, tall = canvas.clientHeight;
    var scale = Math.min((wide - 120) / Math.max(high[0] - low[0], 1e-9), (tall - 90) / Math.max(high[1] - low[1], 1e-9));
    return function (x, y) { return [wide / 2 + scale * (x - (low[0] + high[0]) / 2), tall / 2 - scale * (y - (low[1] + high[1]) / 2)]; };
  }
  function outline(context, p) {
    context.beginPath();
    seen[p].forEach(function (at, i) { if (i) context.lineTo(at[0], at[1]); else context.moveTo(at[0], at[1]); });
    context.closePath();
  }
  function middle(p) {
    return seen[p].reduce(function (sum, at) { return [sum[0] + at[0] / seen[p].length, sum[1] + at[1] / seen[p].length]; }, [0, 0]);
  }

  function paint() {
    var sheet = page.sharpen(canvas), context = sheet.context, action = data.actions[+choice.value], place = project();
    var without = new Set(action.without), top = 1e-9;
    seen = data.panels.map(function (panel) {
      return panel.corners.map(function (n) { return place(data.reference[3 * n], data.reference[3 * n + 1]); });
    });
    data.panels.forEach(function (_, p) { top = Math.max(top, Math.abs(value(action, p))); });
    data.panels.forEach(function (panel, p) {
      var size = Math.abs(value(action, p)), open = without.has(panel.id);
      outline(context, p);
      context.fillStyle = size > 0 ? page.shade(size / top) : "#fff";
      context.globalAlpha = size > 0 ? 0.75 : 1;
      context.fill();
      context.globalAlpha = 1;
      context.strokeStyle = open ? page.ALARM : "#aab3bc"; context.lineWidth = open ? 2.5 : 0.8;
      context.stroke();
    });
    context.strokeStyle = "#7d8791"; context.lineWidth = 1;
    data.segments.forEach(function (part) {
      var a = place(data.reference[3 * part[0]], data.reference[3 * part[0] + 1]), b = place(data.reference[3 * part[1]], data.reference[3 * part[1] + 1]);
      context.beginPath(); context.moveTo(a[0], a[1]); context.lineTo(b[0], b[1]); context.stroke();
    });
    var boxes = [];
    if (action.point.length) {
      var at = place(action.point[0], action.point[1]), level = Math.hypot(action.force[0], action.force[1]), size = Math.hypot(level, action.force[2]);
      context.strokeStyle = "#c2571a"; context.lineWidth = 2.5;
      context.beginPath(); context.arc(at[0], at[1], 8, 0, 7); context.moveTo(at[0] - 13, at[1]); context.lineTo(at[0] + 13, at[1]);
      context.moveTo(at[0], at[1] - 13); context.lineTo(at[0], at[1] + 13); context.stroke();
      if (level > 0.02 * size) {
        var dx = action.force[0] / level, dy = -action.force[1] / level, long = 60 * level / size;
        context.beginPath(); context.moveTo(at[0], at[1]); context.lineTo(at[0] + long * dx, at[1] + long * dy); context.stroke();
      }
      var text = digits(size) + " kN" + (Math.abs(action.force[2]) > 0.02 * size ? action.force[2] > 0 ? " up" : " down" : " level");
      page.label(context, text, at[0], at[1] - 17, "#c2571a");
      boxes.push([at[0], at[1] - 17, 7.2 * text.length], [at[0], at[1], 26]);
    }
    var order = data.panels.map(function (_, p) { return p; });
    order.sort(function (a, b) { return Math.abs(value(action, b)) - Math.abs(value(action, a)) || a - b; });
    order.slice(0, NUMBERS).forEach(function (p) {
      var now = value(action, p), open = without.has(data.panels[p].id), at = middle(p);
      if (!now && !open) return;
      var text = open ? "no value" : (now > 0 ? "\u25bc " : "\u25b2 ") + digits(Math.abs(now) / 1000), wide = 7.2 * text.length;
      var free = boxes.every(function (box) { return Math.abs(box[0] - at[0]) > (box[2] + wide) / 2 || Math.abs(box[1] - at[1] - 4) > 14; });
      if (!free) return;
      boxes.push([at[0], at[1] + 4, wide]);
      page.label(context, text, at[0], at[1] + 4, open ? page.ALARM : page.INK);
    });
    if (under >= 0) { outline(context, under); context.strokeStyle = "#c2571a"; context.lineWidth = 2.5; context.stroke(); }
    say(action);
  }
  function axis(number, name) { return "F" + name + " " + digits(number) + " kN"; }
  function say(action) {
    var size = Math.hypot(action.force[0], action.force[1], action.force[2]);
    var text = "Factor 1, reference state. Sum: " + ["x", "y", "z"].map(function (name, a) { return axis(Math.abs(action.force[a]) < 1e-4 * size ? 0 : action.force[a], name); }).join(", ");
    if (action.point.length) text += ", acting at (" + action.point.map(function (part) { return part.toFixed(2).replace(/^-0\.00$/, "0.00"); }).join(", ") + ") m";
    text += ". ";
    if (action.panels) text += action.panels + " of " + data.panels.length + " panels loaded, " + digits(action.area) + " m\u00b2, " + digits(action.onPlan) + " m\u00b2 on plan. ";
    else text += data.panels.length ? "No panel is loaded by a pressure. " : "";
    if (action.withoutTotal) text += action.withoutTotal + " panels have no value: red.";
    words.textContent = text;
    words.className = action.withoutTotal ? "note alarm" : "note";
  }
  canvas.addEventListener("pointermove", function (event) {
    var found = -1, context = canvas.getContext("2d"), ratio = window.devicePixelRatio || 1;
    for (var p = 0; p < seen.length; p++) {
      outline(context, p);
      if (context.isPointInPath(event.offsetX * ratio, event.offsetY * ratio)) { found = p; break; }
    }
    if (found === under) return;
    under = found;
    if (under < 0) told.textContent = "";
    else {
      var panel = data.panels[under], action = data.actions[+choice.value], lines = [panel.id, panel.skin + (panel.zones ? ", " + panel.zones : ""),
        digits(panel.area) + " m\u00b2, " + digits(panel.onPlan) + " m\u00b2 on plan"];
      if (action.pressure.length && action.pressure[under]) lines.push(digits(action.pressure[under] / 1000) + " kPa normal, on the outer side positive");
      if (action.plan.length && action.plan[under]) lines.push(digits(action.plan[under] / 1000) + " kPa on plan, downward positive");
      told.textContent = lines.join("\n");
    }
    paint();
  });
  choice.addEventListener("change", paint);
  window.addEventListener("resize", paint);
  window.addEventListener("beforeprint", paint);
  paint();
})();
