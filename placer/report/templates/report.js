"use strict";
(() => {
  const source = document.getElementById("events");
  if (!source) return;
  const events = JSON.parse(source.textContent);
  const tip = document.getElementById("tip");
  const words = {data: "holds", value: "value", lent: "lent by", clean: "clean", high: "level 2:", moving: "is being swapped"};
  const light = (name, key, on) => {
    for (const node of document.querySelectorAll(`[data-${name}="${key}"]`)) node.classList.toggle("lit", on);
  };
  for (const name of ["call", "site"]) {
    for (const [kind, on] of [["mouseover", true], ["mouseout", false], ["focusin", true], ["focusout", false]]) {
      document.addEventListener(kind, (event) => {
        const node = event.target.closest ? event.target.closest(`[data-${name}]`) : null;
        if (node) light(name, node.dataset[name], on);
      });
    }
  }
  const time = (ns) => ns >= 1e6 ? `${+(ns / 1e6).toPrecision(4)} ms` : ns >= 1e3 ? `${+(ns / 1e3).toPrecision(4)} us` : `${Math.round(ns)} ns`;
  const at = (site, ns) => {
    const row = events.rows[site];
    if (!row) return null;
    let low = 0, high = row.length / 4 - 1;
    while (low <= high) {
      const middle = (low + high) >> 1;
      if (row[4 * middle + 1] <= ns) low = middle + 1;
      else if (row[4 * middle] > ns) high = middle - 1;
      else return {state: events.states[row[4 * middle + 2]], holder: row[4 * middle + 3]};
    }
    return null;
  };
  const said = (found) => !found ? "nothing" : found.holder < 0 ? words[found.state] : `${words[found.state]} ${events.names[found.holder]}`;
  const map = document.getElementById("map-roles");
  const slider = document.getElementById("clock");
  const output = document.getElementById("clock-time");
  const show = (ns) => {
    for (const line of document.querySelectorAll("svg.timeline .now")) {
      const {left, right} = line.ownerSVGElement.dataset;
      line.setAttribute("transform", `translate(${+left + (right - left) * (ns || 0) / Math.max(1, events.end)} 0)`);
      line.setAttribute("visibility", ns === null ? "hidden" : "visible");
    }
    if (output) output.textContent = ns === null ? "whole run" : `at ${time(ns)}`;
    if (!map) return;
    for (const node of map.querySelectorAll("g[data-site]")) {
      const found = ns === null ? null : at(node.dataset.site, ns);
      if (found) node.dataset.state = found.state;
      else delete node.dataset.state;
    }
  };
  let chosen = null;
  if (slider) {
    document.getElementById("clock-row").hidden = false;
    slider.max = String(Math.max(0, events.end - 1));
    slider.addEventListener("input", () => show(chosen = +slider.value));
    document.getElementById("clock-off").addEventListener("click", () => show(chosen = null));
  }
  for (const svg of document.querySelectorAll("svg.timeline[data-sites]")) {
    const sites = svg.dataset.sites.split(" ");
    let last = null;
    svg.addEventListener("mousemove", (event) => {
      const box = svg.getBoundingClientRect(), scale = svg.viewBox.baseVal.width / box.width;
      const x = (event.clientX - box.left) * scale, y = (event.clientY - box.top) * scale;
      const {left, right} = svg.dataset;
      const ns = Math.min(events.end - 1, Math.max(0, (x - left) / (right - left) * events.end));
      const site = sites[Math.floor((y - events.top) / events.pitch)];
      if (last !== null && last !== site) light("site", last, false);
      last = site === undefined ? null : site;
      if (last === null) return;
      light("site", site, true);
      show(ns);
      tip.textContent = `site ${site} at ${time(ns)}: ${said(at(site, ns))}`;
      tip.style.display = "block";
      tip.style.left = `${Math.max(4, Math.min(event.clientX + 14, innerWidth - 220))}px`;
      tip.style.top = `${event.clientY + 14}px`;
    });
    svg.addEventListener("mouseleave", () => {
      tip.style.display = "none";
      if (last !== null) light("site", last, false);
      last = null;
      show(chosen);
    });
  }
  const open = () => {
    const goal = location.hash.length > 1 ? document.getElementById(location.hash.slice(1)) : null;
    for (let node = goal; node; node = node.parentElement) if (node.tagName === "DETAILS") node.open = true;
    if (goal) goal.scrollIntoView();
  };
  addEventListener("hashchange", open);
  open();
})();
