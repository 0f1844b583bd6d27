"use strict";
(() => {
  const severities = ["critical", "major", "minor", "remark"];
  const all = (selector, from = document) => [...from.querySelectorAll(selector)];
  const form = document.getElementById("filter");
  const index = document.getElementById("index");
  const appearance = document.getElementById("appearance");

  appearance.closest("label").hidden = false;
  appearance.addEventListener("change", () => {
    document.documentElement.dataset.appearance = appearance.value;
  });

  const unfold = (element) => {
    for (let at = element; at; at = at.parentElement) if (at.tagName === "DETAILS") at.open = true;
  };
  const follow = () => {
    const target = document.getElementById(decodeURIComponent(location.hash.slice(1)));
    if (!target) return;
    unfold(target);
    target.scrollIntoView();
    if (target.tabIndex === -1) target.focus({ preventScroll: true });
  };
  window.addEventListener("hashchange", follow);
  if (location.hash) follow();

  let folded = [];
  window.addEventListener("beforeprint", () => {
    // Tables that nobody unfolded stay folded: drawings, scales and the netlist are the evidence.
    folded = all("details:not([open], .fold)");
    folded.forEach((details) => { details.open = true; });
  });
  window.addEventListener("afterprint", () => folded.forEach((details) => { details.open = false; }));

  // A table wider than its frame is scrolled with the arrow keys, so it has to take the focus.
  const frames = new ResizeObserver((seen) => seen.forEach(({ target }) => {
    if (target.scrollWidth > target.clientWidth) target.tabIndex = 0;
    else target.removeAttribute("tabindex");
  }));
  all(".wide").forEach((frame) => frames.observe(frame));

  if (!form) return;
  form.hidden = false;
  all(".keys").forEach((hint) => { hint.hidden = false; });
  const body = index.tBodies[0];
  const rows = [...body.rows];
  const findings = all("article.finding");
  const subjects = all("section.subject");

  const filter = () => {
    const wanted = new FormData(form);
    const fits = (item) =>
      wanted.getAll("severity").includes(item.dataset.severity) &&
      ["family", "device"].every((key) => !wanted.get(key) || wanted.get(key) === item.dataset[key]);
    let shown = 0;
    rows.forEach((row) => { row.hidden = !fits(row); shown += row.hidden ? 0 : 1; });
    findings.forEach((finding) => { finding.hidden = !fits(finding); });
    subjects.forEach((subject) => {
      subject.hidden = !all("article.finding", subject).some((finding) => !finding.hidden);
    });
    document.getElementById("shown").textContent = `${shown} of ${rows.length} findings shown`;
  };
  form.addEventListener("change", filter);
  form.addEventListener("reset", () => setTimeout(filter));
  form.addEventListener("submit", (event) => event.preventDefault());
  form.addEventListener("keydown", (event) => { if (event.key === "Escape") form.reset(); });

  const rank = (row, key) => {
    const value = row.dataset[key];
    if (key === "severity") return severities.indexOf(value);
    return key === "line" ? Number(value) : value;
  };
  const compare = (a, b) =>
    typeof a === "number" ? a - b : a.localeCompare(b, undefined, { numeric: true });
  const headings = all("th[data-key]", index);
  headings.forEach((heading) => {
    const button = document.createElement("button");
    button.type = "button";
    button.append(...heading.childNodes);
    heading.append(button);
    button.addEventListener("click", () => {
      const falls = heading.getAttribute("aria-sort") === "ascending";
      headings.forEach((other) => other.removeAttribute("aria-sort"));
      heading.setAttribute("aria-sort", falls ? "descending" : "ascending");
      const key = heading.dataset.key;
      rows.sort((a, b) => compare(rank(a, key), rank(b, key)) * (falls ? -1 : 1));
      body.append(...rows);
    });
  });

  body.addEventListener("keydown", (event) => {
    const links = rows.filter((row) => !row.hidden).map((row) => row.querySelector("a"));
    const at = links.indexOf(document.activeElement);
    const to = { ArrowDown: at + 1, ArrowUp: at - 1, Home: 0, End: links.length - 1 }[event.key];
    if (at < 0 || to === undefined || !links[to]) return;
    event.preventDefault();
    links[to].focus();
  });
  filter();
})();
