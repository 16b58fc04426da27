"use strict";
// Draws the curves; everything else on the page is plain HTML. Series differ by dash and marker as well as by colour.
(() => {
    const data = document.getElementById("curve-data");
    if (!data || typeof Chart === "undefined") return;
    const curves = JSON.parse(data.textContent);
    const style = getComputedStyle(document.documentElement);
    const ink = style.getPropertyValue("--ink").trim(), line = style.getPropertyValue("--line").trim();
    const dark = matchMedia("(prefers-color-scheme: dark)").matches;
    const hues = dark ? ["#8cb8e8", "#e8b75a", "#9fd0a4", "#e59ab5", "#c3b1ea", "#b9c0c8"]
                      : ["#24568f", "#a0620c", "#2c6e3a", "#98335f", "#5d4596", "#4d5a68"];
    const dashes = [[], [8, 4], [3, 3], [10, 3, 2, 3], [6, 2], [2, 5]];
    const points = ["circle", "rectRot", "triangle", "rect", "cross", "star"];
    const axisTitles = {
        mtf: ["frequency", "modulation transfer"],
        nps: ["frequency", "noise power"],
        "radial-profile": ["distance from the centre", "mean"],
    };
    const titled = (text, unit) => ({
        type: "linear",
        title: { display: true, text: unit ? text + " / " + unit : text, color: ink },
        ticks: { color: ink, callback: (v) => String(Number(v.toPrecision(4))) },
        grid: { color: line },
    });
    const xy = (x, y) => x.map((value, i) => ({ x: value, y: y[i] })).filter((p) => p.x !== null && p.y !== null);

    const series = (c, i) => {
        const colour = hues[i % hues.length];
        const measured = {
            label: c.of, data: xy(c.x, c.y), borderColor: colour, backgroundColor: colour,
            borderDash: dashes[i % dashes.length], borderWidth: 2, pointStyle: points[i % points.length],
            pointRadius: (p) => (p.dataIndex % 8 === (i * 3) % 8 ? 4 : 0), tension: 0,
        };
        const expected = {
            label: c.of + ", expected", data: xy(c.x, c.predicted || []), borderColor: colour, borderDash: [1, 4],
            borderWidth: 1.5, pointStyle: "line", pointRadius: 0, tension: 0,
        };
        return expected.data.length ? [measured, expected] : [measured];
    };
    const chooser = (places, figure, show) => {
        const select = document.createElement("select");
        select.setAttribute("aria-label", "place");
        for (const place of places) select.add(new Option(place, place));
        select.addEventListener("change", () => show(select.value));
        figure.querySelector("figcaption").append(select);
    };

    for (const canvas of document.querySelectorAll("canvas[data-measure]")) {
        const measure = canvas.dataset.measure;
        const all = curves.filter((c) => c.measure === measure);
        const reconstructions = [...new Set(curves.map((c) => c.of))]; // each keeps its colour, dash and marker
        const places = [...new Set(all.map((c) => c.where))];
        const at = (place) =>
            all.filter((c) => c.where === place).flatMap((c) => series(c, reconstructions.indexOf(c.of)));
        const names = axisTitles[measure] || ["", measure];
        const y = titled(names[1], all[0].y_unit);
        if (measure === "mtf") y.min = 0;
        if (measure === "nps") y.beginAtZero = true;
        const chart = new Chart(canvas, {
            type: "line",
            data: { datasets: at(places[0]) },
            options: {
                animation: false, maintainAspectRatio: false, parsing: false, normalized: true,
                interaction: { mode: "nearest", axis: "x", intersect: false },
                scales: { x: { ...titled(names[0], all[0].x_unit), min: 0 }, y },
                plugins: { legend: { labels: { color: ink, usePointStyle: true, boxWidth: 34 } } },
            },
        });
        chooser(places, canvas.closest("figure"), (place) => {
            chart.data.datasets = at(place);
            chart.update();
        });
    }
})();
