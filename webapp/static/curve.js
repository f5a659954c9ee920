"use strict";
// The slider of a curve's page. Every number comes from the service: this moves, asks, and shows what it is told.
(() => {
  const part = document.getElementById("move");
  if (!part) return;
  const slide = document.getElementById("slide");
  const field = part.querySelector("[name='cant']");
  const panel = document.getElementById("at-cant");
  const chain = document.getElementById("chain-around");
  const units = part.querySelector("[name='units']").value;
  const factor = units === "us" ? 1 / 25.4 : 1;
  const unit = units === "us" ? "in" : "mm";
  const levels = part.dataset.levels.split(" ").map(Number);
  let asked = 0;
  let moving = null;
  let waiting = null;

  const text = (mm) => String(Math.round(mm * factor * 1e6) / 1e6);
  const canonical = () => Number(field.value.trim().replace("\u2212", "-").replace(",", ".")) / factor;
  const usable = (mm) => Number.isFinite(mm) && mm >= 0 && mm <= 300 && field.value.trim() !== "";
  const nearest = (mm) => levels.reduce((best, level, i) => (Math.abs(level - mm) < Math.abs(levels[best] - mm) ? i : best), 0);
  const say = () => slide.setAttribute("aria-valuetext", `${text(levels[slide.value])} ${unit}`);

  async function show(address, place, mm) {
    const answer = await fetch(`${address}?cant=${mm}&units=${units}`, { headers: { Accept: "application/json" } });
    if (answer.status !== 200) throw new Error("the service did not answer");
    const told = await answer.json();
    place.innerHTML = told.markup;
    place.dataset.cant = String(mm);
  }

  // One question at a time: while one is open only the latest cant waits behind it.
  async function move(mm) {
    if (moving) { waiting = mm; return; }
    moving = mm;
    panel.setAttribute("aria-busy", "true");
    try { await show(part.dataset.at, panel, mm); } catch { panel.dataset.cant = ""; }
    moving = null;
    if (waiting !== null && waiting !== mm) { const next = waiting; waiting = null; move(next); return; }
    waiting = null;
    panel.setAttribute("aria-busy", "false");
  }

  async function release(mm) {
    const mine = ++asked;
    const held = document.createElement("div");
    try { await show(part.dataset.held, held, mm); } catch { return; }
    if (mine === asked) { chain.innerHTML = held.innerHTML; chain.dataset.cant = String(mm); }
  }

  slide.value = String(nearest(canonical()));
  slide.parentElement.hidden = false;
  for (const button of part.querySelectorAll(".without-script")) button.hidden = true;
  say();
  slide.addEventListener("input", () => {
    const mm = levels[slide.value];
    field.value = text(mm);
    say();
    move(mm);
  });
  slide.addEventListener("change", () => release(levels[slide.value]));
  field.addEventListener("input", () => {
    const mm = canonical();
    if (!usable(mm)) return;
    slide.value = String(nearest(mm));
    say();
    move(mm);
  });
  field.addEventListener("change", () => { if (usable(canonical())) release(canonical()); });
})();
