// The tension map: plan of one state, or of the worst of all; width tells tension, colour the share of the breaking force.
(function () {
  "use strict";
  var data = page.data, digits = page.digits, INK = page.INK, MUTED = page.MUTED, ALARM = page.ALARM;
  var canvas = document.getElementById("map");
  if (!canvas || !data.reference.length) return;
  var choice = document.getElementById("map-state"), arrows = document.getElementById("map-pulls");
  var told = document.getElementById("map-told"), words = document.getElementById("map-words");
  var NUMBERS = 70;
  var nNodes = data.nodes.length, seen = new Float64Array(3 * nNodes), under = null;

  // What is drawn: tensions, slack segments, pulls and, for the worst of all, the cases they come from.
  function shown() {
    if (choice.value === "worst") {
      var worst = data.worst;
      return { worst: true, kn: worst.kn, from: worst.from, slack: new Set(worst.slack), slackFrom: worst.slackFrom,
        pulls: worst.pulls, pullFrom: worst.pullFrom, moves: null, answered: true };
    }
    var now = data.states[+choice.value];
    return { kn: now.kn, slack: new Set(now.slack || []), pulls: now.pulls || [], moves: now.moves, answered: now.answered,
      why: now.why, acting: now.words, id: now.id };
  }
  function name(index) { return index < 0 || !data.states[index] ? "reference" : data.states[index].id; }
  function share(now, s) { return now.kn && now.kn[s] !== null && data.breaking[s] ? now.kn[s] / data.breaking[s] : null; }
  function percent(value) {
    var text = (100 * value).toFixed(0);
    return text === "100" && value > 1 ? (100 * value).toFixed(1) : text;
  }

  function project(moves) {
    var low = [1e300, 1e300], high = [-1e300, -1e300];
    for (var i = 0; i < nNodes; i++) for (var a = 0; a < 2; a++) {
      low[a] = Math.min(low[a], data.reference[3 * i + a]);
      high[a] = Math.max(high[a], data.reference[3 * i + a]);
    }
    var wide = canvas.clientWidth, high_px = canvas.clientHeight, room = Math.min(105, wide / 6);
    var scale = Math.min((wide - 2 * room) / Math.max(high[0] - low[0], 1e-9), (high_px - 120) / Math.max(high[1] - low[1], 1e-9));
    for (var n = 0; n < nNodes; n++) {
      var x = data.reference[3 * n] + (moves ? moves[3 * n] : 0), y = data.reference[3 * n + 1] + (moves ? moves[3 * n + 1] : 0);
      seen[3 * n] = wide / 2 + scale * (x - (low[0] + high[0]) / 2);
      seen[3 * n + 1] = high_px / 2 - scale * (y - (low[1] + high[1]) / 2);
    }
  }
  function line(context, s) {
    var a = data.segments[s][0], b = data.segments[s][1];
    context.beginPath();
    context.moveTo(seen[3 * a], seen[3 * a + 1]);
    context.lineTo(seen[3 * b], seen[3 * b + 1]);
    context.stroke();
  }

  function paint() {
    var sheet = page.sharpen(canvas), context = sheet.context, now = shown(), kn = now.kn;
    project(now.moves);
    var order = data.segments.map(function (_, s) { return s; }), largest = 1e-9;
    if (kn) {
      kn.forEach(function (force) { largest = Math.max(largest, Math.abs(force || 0)); });
      order.sort(function (a, b) { return Math.abs(kn[a] || 0) - Math.abs(kn[b] || 0) || a - b; });
    }
    context.lineCap = "butt";
    // In a fine mesh wide lines would run into each other: a third of a usual segment is wide enough.
    var lengths = data.segments.map(function (part) {
      return Math.hypot(seen[3 * part[0]] - seen[3 * part[1]], seen[3 * part[0] + 1] - seen[3 * part[1] + 1]);
    }).sort(function (a, b) { return a - b; });
    var widest = Math.max(1, Math.min(6.5, lengths[Math.floor(lengths.length / 2)] / 3));
    order.forEach(function (s) {
      var strut = data.segments[s][2] >= data.cables, part = share(now, s), gone = kn && !strut && kn[s] === null;
      context.setLineDash([]);
      if (strut && kn && kn[s] === null && !now.worst) { context.strokeStyle = "#c3cad1"; context.lineWidth = 1; line(context, s); return; }
      if (strut) {
        context.strokeStyle = kn ? INK : MUTED; context.lineWidth = 6; line(context, s);
        context.strokeStyle = "#fff"; context.lineWidth = 2.5; line(context, s);
        return;
      }
      if (!kn || gone) { context.strokeStyle = "#c3cad1"; context.lineWidth = 1; line(context, s); return; }
      if (now.slack.has(s) && !now.worst) {
        context.strokeStyle = MUTED; context.lineWidth = 1.3; context.setLineDash([5, 4]); line(context, s);
        return;
      }
      context.strokeStyle = part === null ? "#98a1aa" : part > 1 ? ALARM : page.shade(part / data.top);
      context.lineWidth = Math.min(1.2, widest / 2) + widest * Math.sqrt(Math.abs(kn[s]) / largest);
      line(context, s);
      if (now.worst && now.slack.has(s)) {
        context.strokeStyle = "#fff"; context.lineWidth = 1.3; context.setLineDash([4, 4]); line(context, s);
      }
    });
    context.setLineDash([]);
    page.supports(context, seen);
    var boxes = kn && arrows.checked ? page.pulls(context, canvas, seen, kn, now.pulls, function (p) { return [p[0], -p[1]]; }) : [];
    if (kn) numbers(context, now, boxes);
    if (under && under.segment >= 0) {
      context.strokeStyle = "rgba(194,87,26,.9)"; context.lineWidth = 3; line(context, under.segment);
    }
    say(now);
  }
  // The share of each rope at its hardest worked segment, hardest first, where there is room.
  function numbers(context, now, boxes) {
    var best = new Map();
    for (var s = 0; s < data.segments.length; s++) {
      var part = share(now, s), member = data.segments[s][2];
      if (part === null || now.slack.has(s) && !now.worst) continue;
      if (!best.has(member) || part > best.get(member)[0]) best.set(member, [part, s]);
    }
    var list = Array.from(best.values()).sort(function (a, b) { return b[0] - a[0] || a[1] - b[1]; }).slice(0, NUMBERS);
    list.forEach(function (entry) {
      var part = data.segments[entry[1]], text = percent(entry[0]) + " %", wide = 7.2 * text.length;
      var x = (seen[3 * part[0]] + seen[3 * part[1]]) / 2, y = (seen[3 * part[0] + 1] + seen[3 * part[1] + 1]) / 2 + 4;
      // On its segment, or close beside it.
      var place = [[0, 0], [0, -15], [0, 15], [wide, 0], [-wide, 0]].find(function (off) {
        return boxes.every(function (box) { return Math.abs(box[0] - x - off[0]) > (box[2] + wide) / 2 || Math.abs(box[1] - y - off[1]) > 14; });
      });
      if (!place) return;
      x += place[0]; y += place[1];
      boxes.push([x, y, wide]);
      page.label(context, text, x, y, entry[0] > 1 ? ALARM : INK);
    });
  }

  function say(now) {
    var text = "";
    if (now.worst) text = "Each rope at its largest tension over all answered states, each anchor at its largest pull: these do not act together. ";
    else if (now.acting) text = "Acting: " + now.acting + ". ";
    if (!now.answered) text += "No answer: " + (now.why || "no cause given") + ". Drawn: the reference state without tensions.";
    else if (!now.kn) text += "Left out of this page for its size; its numbers are in the files.";
    else {
      var most = -1, open = 0;
      for (var s = 0; s < data.segments.length; s++) {
        if (data.segments[s][2] >= data.cables) continue;
        if (now.kn[s] === null) continue;
        var part = share(now, s);
        if (part === null) open += 1;
        else if (most < 0 || part > share(now, most)) most = s;
      }
      if (most >= 0) {
        text += "Hardest worked: " + data.members[data.segments[most][2]] + ", " + percent(share(now, most)) + " % of breaking at " +
          digits(now.kn[most]) + " kN" + (now.worst ? " in " + name(now.from[most]) : "") + ". ";
      }
      var ropes = new Set();
      now.slack.forEach(function (s) { ropes.add(data.members[data.segments[s][2]]); });
      var names = Array.from(ropes), more = names.length - 8;
      text += names.length === 0 ? "No rope is slack." : now.slack.size + " segments slack" + (now.worst ? " in some state" : "") + ", of " +
        names.slice(0, 8).join(", ") + (more > 0 ? " and " + more + " more ropes" : "") + ".";
      if (open) text += " " + open + " segments have no breaking force: grey, not judged.";
    }
    words.textContent = text;
    words.className = now.answered ? "note" : "note alarm";
  }
  function pick(x, y) {
    var now = shown(), best = null, least = 12;
    data.supports.forEach(function (n, i) {
      var away = Math.hypot(seen[3 * n] - x, seen[3 * n + 1] - y);
      if (away < least) { least = away; best = { segment: -1, support: i }; }
    });
    if (!best) for (var s = 0; s < data.segments.length; s++) {
      var a = 3 * data.segments[s][0], b = 3 * data.segments[s][1];
      var dx = seen[b] - seen[a], dy = seen[b + 1] - seen[a + 1], square = dx * dx + dy * dy || 1e-9;
      var t = Math.max(0, Math.min(1, ((x - seen[a]) * dx + (y - seen[a + 1]) * dy) / square));
      var away = Math.hypot(seen[a] + t * dx - x, seen[a + 1] + t * dy - y);
      if (away < least) { least = away; best = { segment: s, support: -1 }; }
    }
    under = best;
    told.textContent = best ? tell(now, best) : "";
    paint();
  }
  function tell(now, at) {
    if (at.support >= 0) {
      var pull = now.pulls && now.pulls[at.support], text = "anchor " + data.nodes[data.supports[at.support]];
      if (!pull) return text;
      return text + "\npull " + digits(Math.hypot(pull[0], pull[1], pull[2])) + " kN: " + page.way(pull) +
        (now.worst ? "\nin " + name(now.pullFrom[at.support]) : "");
    }
    var s = at.segment, part = data.segments[s], line = data.members[part[2]] + "\n" + data.nodes[part[0]] + " to " + data.nodes[part[1]];
    if (now.kn && now.kn[s] === null && !now.worst) return line + "\ntaken out";
    if (!now.kn || now.kn[s] === null || now.kn[s] === undefined) return line;
    if (now.slack.has(s) && !now.worst) return line + "\nslack, 0 kN";
    line += "\n" + digits(Math.abs(now.kn[s])) + " kN" + (now.kn[s] < 0 ? " compression" : "");
    if (part[2] < data.cables) line += data.breaking[s] ? ", " + percent(share(now, s)) + " % of breaking" : ", no breaking force: not judged";
    if (now.worst && part[2] < data.cables) {
      line += " in " + name(now.from[s]);
      if (now.slack.has(s)) line += "\nslack in " + name(now.slackFrom[s]);
    }
    return line;
  }
  canvas.addEventListener("pointermove", function (event) { pick(event.offsetX, event.offsetY); });
  canvas.addEventListener("pointerdown", function (event) { pick(event.offsetX, event.offsetY); });
  canvas.addEventListener("pointerleave", function () { under = null; told.textContent = ""; paint(); });
  choice.addEventListener("change", function () { under = null; told.textContent = ""; paint(); });
  arrows.addEventListener("change", paint);
  window.addEventListener("resize", paint);
  window.addEventListener("beforeprint", paint);
  paint();
})();
