"use strict";
// A page that waits for work: asks how far it is, shows it, and goes on when it has ended.
(() => {
  const part = document.getElementById("work");
  if (!part) return;
  const share = document.getElementById("share");
  const doing = document.getElementById("doing");
  const EVERY_MS = 700;
  const SLOWER_MS = 3000;

  function onwards() {
    const form = document.querySelector("form#onwards");
    if (form) form.requestSubmit();
    else location.replace(part.dataset.then);
  }

  function words(work) {
    if (work.state === "waiting") {
      if (!work.before) return "Next to be begun";
      return `${work.before} ${work.before === 1 ? "piece" : "pieces"} of work before this one`;
    }
    return `${Math.round(100 * work.share)} %, ${work.doing || work.what}`;
  }

  async function look() {
    let next = SLOWER_MS;
    try {
      const answer = await fetch(part.dataset.asks, { headers: { Accept: "application/json" } });
      if (answer.status === 404) { onwards(); return; }
      if (answer.ok) {
        const work = await answer.json();
        if (work.state !== "waiting" && work.state !== "under way") { onwards(); return; }
        if (work.state === "waiting") share.removeAttribute("value");
        else share.value = work.share;
        const said = words(work);
        if (doing.textContent !== said) doing.textContent = said;
        next = EVERY_MS;
      }
    } catch { /* the service is away for a moment */ }
    setTimeout(look, next);
  }

  setTimeout(look, EVERY_MS);
})();
