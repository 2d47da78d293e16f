// Draws the curves of a check: the newer over the older, the band as a shade, limits as lines.
"use strict";
(() => {
  // The plotting script reads a little markup in texts; ours are shown as they are.
  const plain = (text) => text.replace(/&/g, "&amp;").replace(/</g, "&lt;").replace(/>/g, "&gt;");
  const css = (name) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

  function faint(colour, share) {
    const whole = parseInt(colour.slice(1), 16);
    return `rgba(${whole >> 16}, ${(whole >> 8) & 255}, ${whole & 255}, ${share})`;
  }

  const PREFIXES = { 12: "T", 9: "G", 6: "M", 3: "k", 0: "", "-3": "m", "-6": "µ", "-9": "n", "-12": "p", "-15": "f" };
  const PLAIN = new Set(["dB", "", "1", "K"]);

  // Engineering notation, as everywhere else on the page: 1.59 kHz, 164 mV.
  function engineering(value, unit, digits = 4) {
    if (value === null || !Number.isFinite(value)) return "none";
    const symbol = unit === "1" ? "" : unit;
    let power = 0;
    if (value !== 0 && !PLAIN.has(unit)) {
      power = Math.floor(Math.log10(Math.abs(Number(value.toPrecision(digits)))) / 3) * 3;
      power = Math.max(-15, Math.min(12, power));
    }
    const number = String(Number((value / 10 ** power).toPrecision(digits))).replace("-", "−");
    return `${number} ${PREFIXES[power]}${symbol}`.trim();
  }

  // Round numbers inside a range of an axis, about as many as there is room for.
  function roundNumbers([from, to], log, room) {
    const found = [];
    const [low, high] = from < to ? [from, to] : [to, from];
    if (log) {
      const decades = high - low;
      const most = room / Math.max(decades, 0.1);
      const steps = most >= 5 ? [1, 2, 3, 5, 7] : most >= 3 ? [1, 2, 5] : most >= 2 ? [1, 3] : [1];
      const stride = Math.max(1, Math.ceil(decades / room));
      for (let power = Math.floor(low / stride) * stride; power <= high; power += stride) {
        for (const step of steps) {
          const place = power + Math.log10(step);
          if (place >= low - 1e-9 && place <= high + 1e-9) found.push(Number(`${step}e${power}`));
        }
      }
      return found;
    }
    const rough = (high - low) / room;
    const power = Math.floor(Math.log10(rough));
    const step = [1, 2, 5, 10].find((one) => one * 10 ** power >= rough * 0.999) * 10 ** power;
    for (let place = Math.ceil(low / step - 1e-9); place * step <= high + step * 1e-9; place += 1) found.push(place * step);
    return found;
  }

  function axis(about) {
    return {
      title: { text: plain(about.label), standoff: 12, font: { size: 14 } },
      type: about.log ? "log" : "linear",
      gridcolor: css("--hair"),
      zeroline: !about.log,
      zerolinecolor: css("--quiet"),
      linecolor: css("--rule"),
      tickcolor: css("--rule"),
      ticks: "outside",
      ticklen: 5,
      automargin: true,
      exponentformat: "none",
    };
  }

  // Labels for the ranges shown now; again after every zoom.
  function label(place) {
    const { xaxis, yaxis, width, height } = place._fullLayout;
    const shown = JSON.stringify([xaxis.range, yaxis.range, width, height]);
    if (place.labelled === shown) return;
    place.labelled = shown;
    const change = {};
    for (const [name, of, about, room] of [
      ["xaxis", xaxis, place.drawn.x, width / 110],
      ["yaxis", yaxis, place.drawn.y, height / 60],
    ]) {
      const values = roundNumbers(of.range, about.log, room);
      change[`${name}.tickvals`] = values;
      change[`${name}.ticktext`] = values.map((value) => engineering(value, about.unit));
    }
    Plotly.relayout(place, change);
  }

  const looks = {
    before: () => ({ color: css("--quiet"), width: 2, dash: "6px,4px" }),
    after: () => ({ color: css("--good"), width: 2.5, dash: "solid" }),
    input: () => ({ color: css("--ink"), width: 1, dash: "2px,3px" }),
  };

  function traces(plot) {
    const made = [];
    const told = (name, x, y) =>
      x.map((at, place) => `${plain(name)}: ${engineering(y[place], plot.y.unit)} at ${engineering(at, plot.x.unit)}`);
    for (const side of plot.sides) {
      const line = looks[side.role]();
      if (side.low.length) {
        const edge = { type: "scatter", mode: "lines", line: { width: 0 }, hoverinfo: "skip", showlegend: false };
        made.push({ ...edge, x: side.x, y: side.low });
        const shade = faint(line.color, side.role === "after" ? 0.22 : 0.16);
        made.push({ ...edge, x: side.x, y: side.high, fill: "tonexty", fillcolor: shade });
      }
      made.push({
        type: "scatter", mode: "lines", name: plain(side.name), x: side.x, y: side.y, line,
        text: told(side.name, side.x, side.y), hoverinfo: "text",
      });
    }
    const named = new Set();
    for (const limit of plot.limits) {
      made.push({
        type: "scatter", mode: "lines", name: plain(limit.name), x: limit.x, y: limit.y,
        line: { color: css("--bad"), width: 1.5 },
        legendgroup: limit.name, showlegend: !named.has(limit.name),
        text: told(limit.name, limit.x, limit.y), hoverinfo: "text",
      });
      named.add(limit.name);
    }
    return made;
  }

  function layout(plot) {
    return {
      xaxis: axis(plot.x),
      yaxis: axis(plot.y),
      paper_bgcolor: "rgba(0,0,0,0)",
      plot_bgcolor: "rgba(0,0,0,0)",
      font: { family: getComputedStyle(document.body).fontFamily, size: 14, color: css("--ink") },
      margin: { l: 64, r: 12, t: 8, b: 48 },
      legend: { orientation: "h", x: 0, y: 1.02, yanchor: "bottom", xanchor: "left" },
      hovermode: "closest",
      hoverlabel: { bgcolor: css("--ink"), bordercolor: css("--ink"), font: { color: css("--paper"), size: 14 } },
      dragmode: "zoom",
    };
  }

  const config = { displayModeBar: false, displaylogo: false, responsive: true, doubleClick: "reset" };

  async function draw(place, note, href) {
    let plot;
    try {
      const answer = await fetch(href, { cache: "no-store" });
      plot = await answer.json();
    } catch {
      note.textContent = "The curves could not be fetched; they come with the next save or a reload.";
      return;
    }
    note.textContent = plot.note;
    place.hidden = !plot.sides.length;
    if (place.hidden) return;
    if (place.drawn) Plotly.purge(place);
    place.replaceChildren();
    place.drawn = plot;
    place.labelled = "";
    await Plotly.newPlot(place, traces(plot), layout(plot), config);
    place.on("plotly_afterplot", () => label(place));
    label(place);
    place.dataset.curves = String(plot.sides.length);
    place.dataset.limits = String(plot.limits.length);
  }

  let asked = ""; // the frequency that the viewer chose, which outlives a change of the page
  function curves() {
    const place = document.getElementById("plot");
    if (place) draw(place, document.getElementById("plot-note"), place.dataset.curve);
    const form = document.getElementById("sine-form");
    if (!form) return;
    const target = document.getElementById("sine-plot");
    if (asked) form.elements.f.value = asked;
    const ask = () => {
      const f = encodeURIComponent(form.elements.f.value);
      draw(target, document.getElementById("sine-note"), `${form.dataset.sine}&f=${f}`);
    };
    form.addEventListener("submit", (event) => {
      event.preventDefault();
      asked = form.elements.f.value;
      ask();
    });
    for (const button of form.querySelectorAll("[data-frequency]")) {
      button.addEventListener("click", () => {
        asked = form.elements.f.value = button.dataset.frequency;
        ask();
      });
    }
    ask();
  }

  function redraw() {
    for (const place of document.querySelectorAll(".plot")) {
      if (!place.drawn) continue;
      place.labelled = "";
      Plotly.react(place, traces(place.drawn), layout(place.drawn), config);
    }
  }

  curves();
  document.addEventListener("page:changed", curves);
  matchMedia("(prefers-color-scheme: dark)").addEventListener("change", redraw);
})();
