"use strict";
(() => {
  const byId = (id) => document.getElementById(id);
  const table = byId("margin-table");
  const body = table.tBodies[0];
  const rows = [...body.rows];
  const fields = {
    text: byId("f-text"),
    verdict: byId("f-verdict"),
    layer: byId("f-layer"),
    axis: byId("f-axis"),
  };
  const count = byId("count");
  const texts = new Map();

  for (const element of document.querySelectorAll(".js-only")) {
    element.hidden = false;
  }

  /* Filter */
  const textOf = (row) => {
    if (!texts.has(row)) {
      texts.set(row, row.textContent.toLowerCase());
    }
    return texts.get(row);
  };

  const matches = (row, wanted) =>
    (!wanted.verdict || row.dataset.v === wanted.verdict) &&
    (!wanted.axis || row.dataset.a === wanted.axis) &&
    (!wanted.layer || row.dataset.l.split(" ").includes(wanted.layer)) &&
    wanted.words.every((word) => textOf(row).includes(word));

  const filter = () => {
    const wanted = {
      verdict: fields.verdict.value,
      layer: fields.layer.value,
      axis: fields.axis.value,
      words: fields.text.value.toLowerCase().split(/\s+/).filter(Boolean),
    };
    let shown = 0;
    for (const row of rows) {
      row.hidden = !matches(row, wanted);
      shown += row.hidden ? 0 : 1;
    }
    count.textContent =
      shown === rows.length ? `All ${rows.length} checks shown` : `${shown} of ${rows.length} checks shown`;
    count.classList.toggle("narrowed", shown !== rows.length);
  };

  for (const field of Object.values(fields)) {
    field.addEventListener("input", filter);
  }

  /* Sort */
  const valueOf = (row, column, numeric) => {
    const text = row.cells[column].textContent.trim();
    if (!numeric) {
      return text.toLowerCase();
    }
    if (text === "no room") {
      return Infinity;
    }
    const plain = text.replace("\u2212", "-").replace("<", "").replace("\u221e", "Infinity");
    return plain === "\u2013" ? NaN : parseFloat(plain);
  };

  const compare = (a, b) => {
    if (Number.isNaN(a) || Number.isNaN(b)) {
      return Number.isNaN(a) - Number.isNaN(b);
    }
    if (typeof a === "string") {
      return a.localeCompare(b, "en", { numeric: true });
    }
    return a === b ? 0 : a - b;
  };

  const sort = (head, direction) => {
    const owner = head.closest("table");
    const column = head.cellIndex;
    const numeric = head.classList.contains("n");
    const part = owner.tBodies[0];
    const keyed = [...part.rows].map((row) => [valueOf(row, column, numeric), row]);
    const sign = direction === "ascending" ? 1 : -1;
    const missing = (value) => Number.isNaN(value);
    keyed.sort(([a], [b]) => (missing(a) || missing(b) ? compare(a, b) : sign * compare(a, b)));
    part.append(...keyed.map(([, row]) => row));
    for (const other of head.parentElement.cells) {
      other.removeAttribute("aria-sort");
    }
    head.setAttribute("aria-sort", direction);
  };

  for (const head of document.querySelectorAll("table.sortable thead th")) {
    const button = document.createElement("button");
    button.type = "button";
    button.append(...head.childNodes);
    head.append(button);
    button.addEventListener("click", () => {
      sort(head, head.getAttribute("aria-sort") === "ascending" ? "descending" : "ascending");
    });
  }

  byId("f-clear").addEventListener("click", () => {
    for (const field of Object.values(fields)) {
      field.value = "";
    }
    body.append(...rows);
    for (const head of table.tHead.rows[0].cells) {
      head.removeAttribute("aria-sort");
    }
    filter();
  });

  /* Fold-outs */
  const pairs = [...document.querySelectorAll("details.pair")];
  const setAll = (open) => () => pairs.forEach((pair) => (pair.open = open));
  byId("open-all").addEventListener("click", setAll(true));
  byId("close-all").addEventListener("click", setAll(false));

  const openTarget = () => {
    const target = byId(location.hash.slice(1));
    if (target instanceof HTMLDetailsElement) {
      target.open = true;
      target.querySelector("summary").focus();
    } else if (target && target.tabIndex === -1) {
      target.focus({ preventScroll: true });
    }
  };
  window.addEventListener("hashchange", openTarget);
  openTarget();

  /* A wide tree opens with its root in sight. */
  const tree = document.querySelector(".treebox");
  const root = tree.querySelector(".wafer").getBoundingClientRect();
  tree.scrollLeft = root.x + root.width / 2 - tree.getBoundingClientRect().x - tree.clientWidth / 2;

  /* A layer of the tree leads to its row in the mask table and narrows the margin table to its rows. */
  for (const link of document.querySelectorAll(".tree a")) {
    const target = (link.getAttribute("xlink:href") || "").slice(1);
    if (![...fields.layer.options].some((option) => option.value === target)) {
      continue;
    }
    link.addEventListener("click", () => {
      fields.layer.value = target;
      filter();
    });
  }

  filter();
})();
