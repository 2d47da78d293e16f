// Draws the curves of a check: the newer over the older, the band as a shade, limits as lines.
"use strict";
(() => {
  const css = (name) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

  function faint(colour, share) {
    const whole = parseInt(colour.slice(1), 16);
    return `rgba(${whole >> 16}, ${(whole >> 8) & 255}, ${whole & 255}, ${share})`;
  }

  function axis(about) {
    const log = about.log;
    const plain = about.unit === "dB" || about.unit === "";
    return {
      title: { text: about.label, standoff: 12 },
      type: log ? "log" : "linear",
      exponentformat: "SI",
      minexponent: plain ? 6 : 0,
      ticksuffix: about.unit ? (plain ? ` ${about.unit}` : about.unit) : "",
      dtick: log ? 1 : undefined,
      showgrid: true,
      gridcolor: css("--hair"),
      gridwidth: 1,
      zeroline: !log,
      zerolinecolor: css("--quiet"),
      zerolinewidth: 1,
      linecolor: css("--rule"),
      tickcolor: css("--rule"),
      ticks: "outside",
      ticklen: 5,
      automargin: true,
      nticks: 8,
      fixedrange: false,
    };
  }

  const looks = {
    before: () => ({ color: css("--watched"), width: 2, dash: "6px,4px" }),
    after: () => ({ color: css("--good"), width: 2.5, dash: "solid" }),
    input: () => ({ color: css("--ink"), width: 1, dash: "2px,3px" }),
  };

  function traces(plot) {
    const made = [];
    const hover = `%{y:.4~s}${plot.y.unit} at %{x:.4~s}${plot.x.unit}`;
    for (const side of plot.sides) {
      const line = looks[side.role]();
      if (side.low.length) {
        const edge = { type: "scatter", mode: "lines", line: { width: 0 }, hoverinfo: "skip", showlegend: false };
        made.push({ ...edge, x: side.x, y: side.low });
        const shade = faint(line.color, side.role === "after" ? 0.22 : 0.16);
        made.push({ ...edge, x: side.x, y: side.high, fill: "tonexty", fillcolor: shade });
      }
      made.push({
        type: "scatter", mode: "lines", name: side.name, x: side.x, y: side.y, line,
        hovertemplate: `${side.name}: ${hover}<extra></extra>`,
      });
    }
    const named = new Set();
    for (const limit of plot.limits) {
      made.push({
        type: "scatter", mode: "lines", name: limit.name, x: limit.x, y: limit.y,
        line: { color: css("--bad"), width: 1.5, dash: "solid" },
        legendgroup: limit.name, showlegend: !named.has(limit.name),
        hovertemplate: `${limit.name}: %{y:.4~s}${plot.y.unit}<extra></extra>`,
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
    if (!plot.sides.length) {
      Plotly.purge(place);
      place.replaceChildren();
      return;
    }
    place.replaceChildren();
    await Plotly.newPlot(place, traces(plot), layout(plot), config);
    place.drawn = plot;
    place.dataset.curves = String(plot.sides.length);
    place.dataset.limits = String(plot.limits.length);
  }

  function curves() {
    const place = document.getElementById("plot");
    if (place) draw(place, document.getElementById("plot-note"), place.dataset.curve);
    const form = document.getElementById("sine-form");
    if (!form) return;
    const target = document.getElementById("sine-plot");
    const ask = () => {
      const f = encodeURIComponent(form.elements.f.value);
      draw(target, document.getElementById("sine-note"), `${form.dataset.sine}&f=${f}`);
    };
    form.addEventListener("submit", (event) => {
      event.preventDefault();
      ask();
    });
    for (const button of form.querySelectorAll("[data-frequency]")) {
      button.addEventListener("click", () => {
        form.elements.f.value = button.dataset.frequency;
        ask();
      });
    }
    ask();
  }

  function redraw() {
    for (const place of document.querySelectorAll(".plot")) {
      if (place.drawn) Plotly.react(place, traces(place.drawn), layout(place.drawn), config);
    }
  }

  curves();
  document.addEventListener("page:changed", curves);
  matchMedia("(prefers-color-scheme: dark)").addEventListener("change", redraw);
})();
