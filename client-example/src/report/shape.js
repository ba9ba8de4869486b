// The turning shape. Orthographic, so that lengths on the screen can be compared; painted from back to front.
(function () {
  "use strict";
  var data = page.data, digits = page.digits, label = page.label, colour = page.tensionColour;
  var INK = page.INK, MUTED = page.MUTED, ALARM = page.ALARM, PALE = "#b4bcc4";
  var canvas = document.getElementById("net");
  if (!canvas || !data.reference.length) return;
  var context = canvas.getContext("2d");
  var told = document.getElementById("told");
  var acting = document.getElementById("acting");
  var stateChoice = document.getElementById("state");
  var timesChoice = document.getElementById("times");
  var pullsChoice = document.getElementById("pulls");
  var nNodes = data.nodes.length;

  var view = { turn: -0.6, tilt: 0.42, zoom: 1, x: 0, y: 0 };
  var places = new Float64Array(data.reference);
  var seen = new Float64Array(nNodes * 3);
  var seenBefore = new Float64Array(nNodes * 3);
  var under = -1, moving = 0;

  var middle = [0, 0, 0], span = 0;
  (function () {
    var low = [1e300, 1e300, 1e300], high = [-1e300, -1e300, -1e300];
    for (var i = 0; i < nNodes; i++) for (var a = 0; a < 3; a++) {
      low[a] = Math.min(low[a], data.reference[3 * i + a]);
      high[a] = Math.max(high[a], data.reference[3 * i + a]);
    }
    for (var b = 0; b < 3; b++) middle[b] = (low[b] + high[b]) / 2;
    span = Math.max(Math.hypot(high[0] - low[0], high[1] - low[1], high[2] - low[2]), 1e-9);
  })();

  function state() { return data.states[+stateChoice.value]; }

  // Places of the chosen state, movements enlarged.
  function target() {
    var goal = new Float64Array(data.reference), moves = state().moves, times = +timesChoice.value;
    if (moves) for (var i = 0; i < goal.length; i++) goal[i] += times * moves[i];
    return goal;
  }

  function project(from, to, frame) {
    var ct = Math.cos(view.turn), st = Math.sin(view.turn), ci = Math.cos(view.tilt), si = Math.sin(view.tilt);
    for (var i = 0; i < nNodes; i++) {
      var x = from[3 * i] - middle[0], y = from[3 * i + 1] - middle[1], z = from[3 * i + 2] - middle[2];
      var right = x * ct - y * st, ahead = x * st + y * ct;
      to[3 * i] = frame.x + frame.scale * right;
      to[3 * i + 1] = frame.y - frame.scale * (z * ci + ahead * si);
      to[3 * i + 2] = ahead * ci - z * si;
    }
  }

  // A scale at which every node fits, whatever the turn.
  function frame() {
    var wide = canvas.clientWidth, high = canvas.clientHeight;
    return { x: wide / 2 + view.x, y: high / 2 + view.y, scale: view.zoom * fit(wide, high) };
  }
  function fit(wide, high) {
    var ct = Math.cos(view.turn), st = Math.sin(view.turn), ci = Math.cos(view.tilt), si = Math.sin(view.tilt), w = 1e-9, h = 1e-9;
    for (var i = 0; i < nNodes; i++) {
      var x = data.reference[3 * i] - middle[0], y = data.reference[3 * i + 1] - middle[1], z = data.reference[3 * i + 2] - middle[2];
      w = Math.max(w, Math.abs(x * ct - y * st));
      h = Math.max(h, Math.abs(z * ci + (x * st + y * ct) * si));
    }
    return Math.max(Math.min((wide / 2 - Math.min(105, wide / 6)) / w, (high / 2 - 64) / h), wide / span / 9);
  }

  var order = data.segments.map(function (_, i) { return i; });

  function paint() {
    page.sharpen(canvas);
    var now = state(), shape = frame(), kn = now.kn;
    project(places, seen, shape);
    project(data.reference, seenBefore, shape);
    if (kn && now.id !== "reference") ghost();
    var slack = new Set(now.slack || []), largest = 1e-9;
    if (kn) for (var k = 0; k < kn.length; k++) largest = Math.max(largest, Math.abs(kn[k]));
    order.sort(function (a, b) { return depth(b) - depth(a); });
    order.forEach(function (s) { segment(s, now, kn, slack.has(s), largest); });
    page.supports(context, seen);
    if (kn && pullsChoice.checked) pulls(now);
    look(now);
    if (under >= 0) highlight(under);
  }

  function depth(s) { return seen[3 * data.segments[s][0] + 2] + seen[3 * data.segments[s][1] + 2]; }
  function line(list, s) {
    var a = data.segments[s][0], b = data.segments[s][1];
    context.beginPath();
    context.moveTo(list[3 * a], list[3 * a + 1]);
    context.lineTo(list[3 * b], list[3 * b + 1]);
    context.stroke();
  }
  function ghost() {
    context.strokeStyle = PALE; context.lineWidth = 0.7; context.setLineDash([]);
    for (var s = 0; s < data.segments.length; s++) line(seenBefore, s);
  }
  function segment(s, now, kn, slack, largest) {
    var strut = data.segments[s][2] >= data.cables;
    context.setLineDash([]);
    context.lineCap = "round";
    if (kn && kn[s] === null) { context.strokeStyle = PALE; context.lineWidth = 0.8; context.setLineDash([1, 4]); line(seen, s); return; }
    if (strut) {
      context.strokeStyle = kn ? INK : MUTED; context.lineWidth = 7; line(seen, s);
      context.strokeStyle = "#fff"; context.lineWidth = 3; line(seen, s);
      return;
    }
    if (!kn) { context.strokeStyle = "#9aa4ae"; context.lineWidth = 1; line(seen, s); return; }
    if (slack) { context.strokeStyle = MUTED; context.lineWidth = 1.2; context.setLineDash([5, 4]); line(seen, s); return; }
    context.strokeStyle = colour(kn[s]);
    context.lineWidth = 1.1 + 4.4 * Math.sqrt(Math.abs(kn[s]) / largest);
    line(seen, s);
  }
  // Pulls as arrows outside the net. Their size on screen says nothing.
  function pulls(now) {
    var ct = Math.cos(view.turn), st = Math.sin(view.turn), ci = Math.cos(view.tilt), si = Math.sin(view.tilt);
    page.pulls(context, canvas, seen, now.kn, now.pulls, function (p) {
      return [p[0] * ct - p[1] * st, -(p[2] * ci + (p[0] * st + p[1] * ct) * si)];
    });
  }
  function look(now) {
    context.setLineDash([]);
    data.segments.forEach(function (part, s) {
      if (now.lookMembers.indexOf(part[2]) >= 0) { context.strokeStyle = ALARM; context.lineWidth = 2.5; line(seen, s); }
    });
    now.lookNodes.forEach(function (n, i) {
      context.strokeStyle = ALARM; context.lineWidth = 2.5;
      context.beginPath(); context.arc(seen[3 * n], seen[3 * n + 1], 9, 0, 7); context.stroke();
      if (i < 3) label(context, data.nodes[n], seen[3 * n] + 14, seen[3 * n + 1] - 8, ALARM, "left");
    });
  }
  function highlight(s) {
    context.strokeStyle = "rgba(194,87,26,.85)"; context.lineWidth = 3; context.setLineDash([]);
    data.segments.forEach(function (part, other) { if (part[2] === data.segments[s][2]) { context.globalAlpha = other === s ? 1 : 0.35; line(seen, other); } });
    context.globalAlpha = 1;
  }

  function tell() {
    if (under < 0) { told.textContent = ""; return; }
    var part = data.segments[under], now = state();
    var text = data.members[part[2]] + "\n" + data.nodes[part[0]] + " to " + data.nodes[part[1]];
    if (now.kn) {
      var kn = now.kn[under];
      if (kn === null) text += "\ntaken out";
      else if ((now.slack || []).indexOf(under) >= 0) text += "\nslack, 0 kN";
      else if (part[2] >= data.cables) text += "\n" + digits(Math.abs(kn)) + " kN " + (kn < 0 ? "compression" : "tension");
      else text += "\n" + digits(kn) + " kN" + (data.breaking[under] ? ", " + Math.round(100 * kn / data.breaking[under]) + " % of breaking" : "");
      var move = function (n) { return Math.hypot(now.moves[3 * n], now.moves[3 * n + 1], now.moves[3 * n + 2]) * 1000; };
      if (now.id !== "reference") text += "\nends moved " + digits(move(part[0])) + " and " + digits(move(part[1])) + " mm";
    }
    told.textContent = text;
  }
  function pick(x, y) {
    var best = -1, least = 14;
    for (var s = 0; s < data.segments.length; s++) {
      var a = 3 * data.segments[s][0], b = 3 * data.segments[s][1];
      var dx = seen[b] - seen[a], dy = seen[b + 1] - seen[a + 1], square = dx * dx + dy * dy || 1e-9;
      var t = Math.max(0, Math.min(1, ((x - seen[a]) * dx + (y - seen[a + 1]) * dy) / square));
      var away = Math.hypot(seen[a] + t * dx - x, seen[a + 1] + t * dy - y);
      if (away < least) { least = away; best = s; }
    }
    if (best !== under) { under = best; tell(); paint(); }
  }

  // Changing the state moves the net there, unless the reader asked for stillness.
  function show() {
    var now = state(), goal = target(), start = places.slice(), begin = performance.now(), mine = ++moving;
    var words = now.words ? "Acting: " + now.words + "." : "";
    if (!now.answered) words += " No answer: " + (now.why || "no cause given") + ". Shown is the reference state.";
    else if (!now.kn) words += " Left out of this page for its size; its numbers are in the files.";
    acting.textContent = words;
    acting.className = now.answered ? "note" : "note alarm";
    tell();
    if (window.matchMedia("(prefers-reduced-motion: reduce)").matches || document.hidden) { places = goal; paint(); return; }
    (function step(time) {
      if (mine !== moving) return;
      var share = Math.min(1, Math.max(0, (time - begin) / 350)), eased = share * share * (3 - 2 * share);
      for (var i = 0; i < goal.length; i++) places[i] = start[i] + (goal[i] - start[i]) * eased;
      paint();
      if (share < 1) requestAnimationFrame(step);
    })(begin);
  }

  var fingers = new Map(), spread = 0;
  canvas.addEventListener("pointerdown", function (event) {
    canvas.setPointerCapture(event.pointerId);
    fingers.set(event.pointerId, [event.offsetX, event.offsetY]);
    spread = 0;
    if (event.pointerType === "touch") pick(event.offsetX, event.offsetY);
  });
  canvas.addEventListener("pointermove", function (event) {
    var before = fingers.get(event.pointerId);
    if (!before) { pick(event.offsetX, event.offsetY); return; }
    var dx = event.offsetX - before[0], dy = event.offsetY - before[1];
    fingers.set(event.pointerId, [event.offsetX, event.offsetY]);
    if (fingers.size === 2) {
      var two = Array.from(fingers.values()), now = Math.hypot(two[0][0] - two[1][0], two[0][1] - two[1][1]);
      if (spread) zoom(now / spread);
      spread = now; view.x += dx / 2; view.y += dy / 2;
    } else if (event.shiftKey) { view.x += dx; view.y += dy; }
    else turn(dx * 0.008, dy * 0.006);
    paint();
  });
  ["pointerup", "pointercancel"].forEach(function (name) {
    canvas.addEventListener(name, function (event) { fingers.delete(event.pointerId); spread = 0; });
  });
  canvas.addEventListener("wheel", function (event) { event.preventDefault(); zoom(Math.exp(-event.deltaY * 0.0012)); paint(); }, { passive: false });
  canvas.addEventListener("keydown", function (event) {
    var step = 0.08;
    if (event.key === "ArrowLeft") turn(-step, 0);
    else if (event.key === "ArrowRight") turn(step, 0);
    else if (event.key === "ArrowUp") turn(0, -step);
    else if (event.key === "ArrowDown") turn(0, step);
    else if (event.key === "+" || event.key === "=") zoom(1.15);
    else if (event.key === "-" || event.key === "−") zoom(1 / 1.15);
    else return;
    event.preventDefault(); paint();
  });
  function turn(about, over) { view.turn += about; view.tilt = Math.max(-Math.PI / 2, Math.min(Math.PI / 2, view.tilt + over)); }
  function zoom(by) { view.zoom = Math.max(0.3, Math.min(40, view.zoom * by)); }
  document.querySelectorAll("[data-view]").forEach(function (button) {
    button.addEventListener("click", function () {
      var set = { askew: [-0.6, 0.42], plan: [0, Math.PI / 2], x: [Math.PI / 2, 0], y: [0, 0] }[button.dataset.view];
      view = { turn: set[0], tilt: set[1], zoom: 1, x: 0, y: 0 };
      paint();
    });
  });
  // The address names the state, as `#case=` and its id, so that a link can point at it.
  function fromAddress() {
    var named = /^#case=(.*)$/.exec(window.location.hash), id;
    try { id = named && decodeURIComponent(named[1]); } catch (_) { return false; }
    var found = data.states.findIndex(function (one) { return one.id === id; });
    if (found < 0 || stateChoice.value === String(found)) return false;
    stateChoice.value = String(found);
    return true;
  }
  window.addEventListener("hashchange", function () { if (fromAddress()) show(); });
  stateChoice.addEventListener("change", function () {
    try { window.history.replaceState(null, "", "#case=" + encodeURIComponent(state().id)); } catch (_) { /* a page without an address */ }
    show();
  });
  timesChoice.addEventListener("change", show);
  pullsChoice.addEventListener("change", paint);
  window.addEventListener("resize", paint);
  window.addEventListener("beforeprint", paint);
  fromAddress();
  show();
})();
