"use strict";
(function () {
  var root = document.documentElement;
  var all = function (sel, from) { return Array.prototype.slice.call((from || document).querySelectorAll(sel)); };

  // Light or dark by hand; without a choice the page follows the system.
  var tone = document.getElementById("tone");
  var dark = function () {
    var t = root.getAttribute("data-tone");
    return t ? t === "dark" : !!(window.matchMedia && matchMedia("(prefers-color-scheme: dark)").matches);
  };
  var nameTone = function () { tone.textContent = dark() ? "Light" : "Dark"; };
  tone.addEventListener("click", function () { root.setAttribute("data-tone", dark() ? "light" : "dark"); nameTone(); });
  nameTone();

  // The corner, the same one in every section.
  function choose(k) {
    root.setAttribute("data-corner", k);
    all(".at").forEach(function (e) { e.classList.toggle("on", e.getAttribute("data-for") === k); });
    all(".chooser input").forEach(function (e) { e.checked = e.value === k; });
  }
  all(".chooser input").forEach(function (e) { e.addEventListener("change", function () { choose(e.value); }); });
  choose("0");

  // The place of a pointer on a drawing, in the drawing's own units.
  function inDrawing(svg, event) {
    var box = svg.getBoundingClientRect(), view = svg.viewBox.baseVal;
    return { x: view.x + (event.clientX - box.left) / box.width * view.width, y: view.y + (event.clientY - box.top) / box.height * view.height };
  }
  function figures(v) {
    var a = Math.abs(v);
    var t = a >= 100 ? v.toFixed(0) : a >= 10 ? v.toFixed(1) : a >= 1 ? v.toFixed(2) : v.toFixed(3);
    return t.replace("-", "\u2212");
  }

  // Waveforms: a cursor by pointer or slider, and what it reads.
  var traces = JSON.parse(document.getElementById("traces").textContent) || [];
  all(".period").forEach(function (figure) {
    var data = traces[+figure.getAttribute("data-trace")];
    var svg = figure.querySelector("svg"), slider = figure.querySelector("input"), out = figure.querySelector("output");
    if (!data || !svg) { return; }
    var frames = all(".frame", svg);
    var lines = frames.map(function () {
      var l = document.createElementNS("http://www.w3.org/2000/svg", "line");
      l.setAttribute("class", "cross");
      svg.appendChild(l);
      return l;
    });
    slider.max = data.t.length - 1;
    function show(i) {
      i = Math.max(0, Math.min(data.t.length - 1, i));
      slider.value = i;
      frames.forEach(function (f, n) {
        var x0 = +f.getAttribute("data-x0"), x1 = +f.getAttribute("data-x1");
        var left = +f.getAttribute("x"), top = +f.getAttribute("y");
        var x = left + (data.t[i] - x0) / (x1 - x0) * +f.getAttribute("width");
        lines[n].setAttribute("x1", x); lines[n].setAttribute("x2", x);
        lines[n].setAttribute("y1", top); lines[n].setAttribute("y2", top + +f.getAttribute("height"));
      });
      out.textContent = "";
      var words = figures(data.t[i]) + " \u00b5s";
      [["time", data.t[i], "\u00b5s"]].concat(data.traces.map(function (t) { return [t.name, t.v[i], t.unit]; })).forEach(function (t, n) {
        var s = document.createElement("span"), b = document.createElement("b");
        b.textContent = figures(t[1]) + " " + t[2];
        s.append(t[0] + " ", b);
        out.appendChild(s);
        if (n > 0) { words += ", " + t[0] + " " + figures(t[1]) + " " + t[2]; }
      });
      slider.setAttribute("aria-valuetext", words);
    }
    slider.addEventListener("input", function () { show(+slider.value); });
    svg.addEventListener("pointermove", function (e) {
      var f = frames[0], at = inDrawing(svg, e);
      var t = +f.getAttribute("data-x0") + (at.x - +f.getAttribute("x")) / +f.getAttribute("width") * (+f.getAttribute("data-x1") - +f.getAttribute("data-x0"));
      var lo = 0, hi = data.t.length - 1;
      while (hi - lo > 1) { var mid = (lo + hi) >> 1; if (data.t[mid] < t) { lo = mid; } else { hi = mid; } }
      show(t - data.t[lo] < data.t[hi] - t ? lo : hi);
    });
    show(Math.round(data.t.length / 8));
  });

  // Core sizes: marks by pointer or arrow keys, their rows by Enter or click.
  function pick(id, scroll) {
    all(".picked").forEach(function (e) { e.classList.remove("picked"); });
    all('.sizes .mark[data-mark="' + id + '"]').forEach(function (e) { e.classList.add("picked"); });
    var row = document.getElementById("size-" + id);
    if (!row) { return; }
    row.classList.add("picked");
    if (scroll) {
      if (row.hidden) { clearFilter(); }
      row.scrollIntoView({ block: "nearest" });
      row.focus({ preventScroll: true });
    }
  }
  all(".sizes").forEach(function (figure) {
    var svg = figure.querySelector("svg"), tip = figure.querySelector(".tip");
    var marks = all(".mark[data-mark]", svg).map(function (e) {
      var b = e.getBBox();
      return { e: e, x: b.x + b.width / 2, y: b.y + b.height / 2, id: e.getAttribute("data-mark") };
    }).sort(function (a, b) { return a.x - b.x || a.y - b.y; });
    if (!marks.length) { return; }
    var now = -1;
    svg.setAttribute("tabindex", "0");
    svg.setAttribute("role", "application");
    svg.setAttribute("aria-label", svg.querySelector("title").textContent + ". Arrow keys step through the marks, Enter finds the row.");
    svg.querySelector("title").remove(); // the tip below says more than a bubble with the title would
    function show(i) {
      now = (i + marks.length) % marks.length;
      marks.forEach(function (m, k) { m.e.classList.toggle("near", k === now); });
      tip.textContent = marks[now].e.getAttribute("data-tip");
    }
    svg.addEventListener("pointermove", function (ev) {
      var at = inDrawing(svg, ev), best = -1, least = 6 * 6;
      marks.forEach(function (m, k) {
        var d = (m.x - at.x) * (m.x - at.x) + (m.y - at.y) * (m.y - at.y);
        if (d < least) { least = d; best = k; }
      });
      if (best >= 0) { show(best); }
    });
    svg.addEventListener("click", function () { if (now >= 0) { pick(marks[now].id, true); } });
    svg.addEventListener("keydown", function (ev) {
      var step = { ArrowRight: 1, ArrowDown: 1, ArrowLeft: -1, ArrowUp: -1 }[ev.key];
      if (step) { show(now < 0 ? 0 : now + step); }
      else if (ev.key === "Home") { show(0); }
      else if (ev.key === "End") { show(marks.length - 1); }
      else if ((ev.key === "Enter" || ev.key === " ") && now >= 0) { pick(marks[now].id, true); }
      else { return; }
      ev.preventDefault();
    });
    svg.addEventListener("focus", function () { if (now < 0) { show(0); } });
  });

  var table = document.getElementById("size-table");
  var find = document.getElementById("find"), part = document.getElementById("only-part"), kept = document.getElementById("only-kept"), count = document.getElementById("count");
  function filter() {
    var words = find.value.trim().toLowerCase().split(/\s+/), shown = 0, rows = all("tbody tr", table);
    rows.forEach(function (r) {
      var text = " " + Array.prototype.map.call(r.cells, function (c) { return c.textContent; }).join(" ").toLowerCase();
      var ok = words.every(function (w) { return text.indexOf(" " + w) >= 0; }) && (!part.value || r.getAttribute("data-part") === part.value) && (!kept.checked || !r.classList.contains("stopped"));
      r.hidden = !ok;
      shown += ok ? 1 : 0;
    });
    count.textContent = shown + " of " + rows.length + " sizes" + (shown ? "" : ": nothing matches");
  }
  function clearFilter() { find.value = ""; part.value = ""; kept.checked = false; filter(); }
  if (table) {
    find.addEventListener("input", filter);
    part.addEventListener("change", filter);
    kept.addEventListener("change", filter);
    find.form.addEventListener("submit", function (e) { e.preventDefault(); });
    var order = new Intl.Collator("en", { numeric: true });
    all("thead button", table).forEach(function (b) {
      b.addEventListener("click", function () {
        var th = b.parentNode, up = th.getAttribute("aria-sort") !== "ascending", by = "data-" + b.getAttribute("data-by");
        all("th[aria-sort]", table).forEach(function (h) { h.setAttribute("aria-sort", "none"); });
        th.setAttribute("aria-sort", up ? "ascending" : "descending");
        var numbers = /volume|loss|over/.test(by), body = table.tBodies[0];
        all("tr", body).sort(function (x, y) {
          var a = x.getAttribute(by), c = y.getAttribute(by);
          return (up ? 1 : -1) * (numbers ? a - c : order.compare(a, c));
        }).forEach(function (r) { body.appendChild(r); });
      });
    });
    all("tbody tr", table).forEach(function (r) { r.addEventListener("click", function () { pick(r.id.slice(5), false); }); });
    filter();
  }

  // Where the figures come from: a filter, and links that open what they lead to.
  var figureFind = document.getElementById("find-figure"), figureCount = document.getElementById("figure-count"), origins = all(".origin");
  function filterOrigins() {
    var words = figureFind.value.trim().toLowerCase().split(/\s+/), shown = 0;
    origins.forEach(function (d) {
      var text = d.querySelector("summary").textContent.toLowerCase();
      d.hidden = !words.every(function (w) { return text.indexOf(w) >= 0; });
      shown += d.hidden ? 0 : 1;
    });
    all(".origin-group").forEach(function (g) { g.hidden = !g.querySelector(".origin:not([hidden])"); });
    figureCount.textContent = shown + " of " + origins.length + " figures" + (shown ? "" : ": nothing matches");
  }
  function openOrigin(id) {
    var summary = /^from-/.test(id) && document.getElementById(id);
    if (!summary) { return; }
    if (summary.parentNode.hidden) { figureFind.value = ""; filterOrigins(); }
    summary.parentNode.open = true;
  }
  if (figureFind) {
    figureFind.addEventListener("input", filterOrigins);
    // Enter opens the first that was found.
    figureFind.form.addEventListener("submit", function (e) {
      e.preventDefault();
      var first = document.querySelector(".origin:not([hidden]) summary");
      if (first) { first.parentNode.open = true; first.focus(); }
    });
    all("a.from").forEach(function (a) { a.addEventListener("click", function () { openOrigin(a.getAttribute("href").slice(1)); }); });
    filterOrigins();
    openOrigin(location.hash.slice(1));
  }
})();
