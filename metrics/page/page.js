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
        ticks: { color: ink },
        grid: { color: line },
    });
    const xy = (x, y) => x.map((value, i) => ({ x: value, y: y[i] })).filter((p) => p.x !== null && p.y !== null);

    for (const canvas of document.querySelectorAll("canvas[data-measure]")) {
        const measure = canvas.dataset.measure;
        const shown = curves.filter((c) => c.measure === measure);
        if (!shown.length) continue;
        const datasets = [];
        shown.forEach((c, i) => {
            const colour = hues[i % hues.length];
            datasets.push({
                label: c.of + ", " + c.where, data: xy(c.x, c.y), borderColor: colour, backgroundColor: colour,
                borderDash: dashes[i % dashes.length], borderWidth: 2, pointStyle: points[i % points.length],
                pointRadius: (p) => (p.dataIndex % 8 === (i * 3) % 8 ? 4 : 0), tension: 0,
            });
            if (c.expected && c.expected.some((v) => v !== null))
                datasets.push({
                    label: c.of + ", expected", data: xy(c.x, c.expected), borderColor: colour, borderDash: [1, 4],
                    borderWidth: 1.5, pointStyle: "line", pointRadius: 0, tension: 0,
                });
        });
        const names = axisTitles[measure] || ["", measure];
        const y = titled(names[1], shown[0].y_unit);
        if (measure === "mtf") y.min = 0;
        if (measure === "nps") y.beginAtZero = true;
        new Chart(canvas, {
            type: "line",
            data: { datasets },
            options: {
                animation: false, maintainAspectRatio: false, parsing: false, normalized: true,
                interaction: { mode: "nearest", axis: "x", intersect: false },
                scales: { x: { ...titled(names[0], shown[0].x_unit), min: 0 }, y },
                plugins: { legend: { labels: { color: ink, usePointStyle: true, boxWidth: 34 } } },
            },
        });
    }
})();
