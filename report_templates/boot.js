"use strict";
// Unpacks the plotting script that this page carries and draws the charts. Without it, or in a browser
// that cannot unpack it, the page is complete in words and tables: the empty places stay hidden.
(async () => {
  const root = document.documentElement;
  const openAll = () => document.querySelectorAll("details").forEach((part) => {
    if (!part.open) { part.open = true; part.dataset.shut = ""; }
  });
  const shutAgain = () => document.querySelectorAll("details[data-shut]").forEach((part) => {
    part.open = false; delete part.dataset.shut;
  });
  addEventListener("beforeprint", openAll);
  addEventListener("afterprint", shutAgain);

  const packed = document.getElementById("plotting").textContent;
  if (typeof DecompressionStream !== "function") { root.dataset.pictures = "unsupported"; return; }
  const bytes = Uint8Array.from(atob(packed), (letter) => letter.charCodeAt(0));
  const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate"));
  const script = document.createElement("script");
  script.textContent = await new Response(stream).text();
  document.head.append(script);

  const charts = JSON.parse(document.getElementById("charts").textContent);
  // A chart keeps the width it was drawn with; on paper it is scaled to the width of the sheet.
  const sheet = 640;
  const fit = (place) => place.style.setProperty("--on-paper", String(Math.min(1, sheet / place.offsetWidth)));
  root.dataset.pictures = "drawing";
  for (const [id, chart] of Object.entries(charts.figures)) {
    const place = document.getElementById(id);
    const layout = { ...charts.layout, ...chart.layout, height: place.clientHeight };
    await Plotly.newPlot(place, chart.data, layout, charts.config);
    fit(place);
  }
  addEventListener("resize", () => document.querySelectorAll(".chart").forEach(fit));
  root.dataset.pictures = "drawn";
})();
