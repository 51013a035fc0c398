/* Small comforts; every page works without them. */
"use strict";

/* Open what a link points at, so that "Show working" shows it. */
function openTarget() {
  const target = location.hash && document.getElementById(location.hash.slice(1));
  if (!target) return;
  for (const details of target.querySelectorAll("details.working")) details.open = true;
  if (target instanceof HTMLDetailsElement) target.open = true;
}
window.addEventListener("hashchange", openTarget);
window.addEventListener("DOMContentLoaded", () => {
  openTarget();
  /* A chosen day judges at once. */
  const day = document.getElementById("on");
  if (day) day.addEventListener("change", () => day.form.requestSubmit());
  /* Send a form once. */
  for (const form of document.querySelectorAll('form[method="post"]'))
    form.addEventListener("submit", () => {
      for (const button of form.querySelectorAll("button"))
        setTimeout(() => { button.disabled = true; }, 0);
    });
});
/* A page shown again by the back button may send again. */
window.addEventListener("pageshow", () => {
  for (const button of document.querySelectorAll("button:disabled")) button.disabled = false;
});
/* On paper nothing can be unfolded, so every working is printed open. */
window.addEventListener("beforeprint", () => {
  for (const details of document.querySelectorAll("details:not([open])")) {
    details.open = true;
    details.dataset.folded = "";
  }
});
window.addEventListener("afterprint", () => {
  for (const details of document.querySelectorAll("details[data-folded]")) {
    details.open = false;
    delete details.dataset.folded;
  }
});
