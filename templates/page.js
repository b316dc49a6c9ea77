"use strict";
(() => {
  const data = JSON.parse(document.getElementById("data").textContent);
  const LIMITS = [
    ["mean_error", "Mean error, at most [reference sd]", 0.001, 2],
    ["variance_ratio_low", "Variance ratio, at least", 0.05, 1],
    ["variance_ratio_high", "Variance ratio, at most", 1, 20],
    ["cross_covariance_error", "Cross-covariance error, at most [correlation]", 0.001, 2],
    ["nees_ratio_low", "Expected NEES ratio, at least", 0.05, 1],
    ["nees_ratio_high", "Expected NEES ratio, at most", 1, 20],
    ["excess", "Excess, at most [nats]", 0.0005, 5],
    ["floor", "Floor, at most [nats]", 0.0005, 5],
  ];
  const PAGE = 50;

  const make = (tag, attributes = {}, ...children) => {
    const node = document.createElement(tag);
    for (const [key, value] of Object.entries(attributes)) {
      if (key === "class") node.className = value;
      else if (key.startsWith("on")) node.addEventListener(key.slice(2), value);
      else if (value === true) node.setAttribute(key, "");
      else if (value !== false && value !== null) node.setAttribute(key, value);
    }
    node.append(...children);
    return node;
  };
  const number = (value) => {
    if (Number.isNaN(value)) return "–";
    const size = Math.abs(value);
    return size !== 0 && (size < 1e-3 || size >= 1e4) ? value.toExponential(2) : value.toFixed(size < 1 ? 4 : 3);
  };
  const error = (value) => (Number.isNaN(value) ? "" : " ± " + value.toExponential(1));
  const percent = (count, of) => (of === 0 ? "–" : Math.round((100 * count) / of) + " %");
  const word = (name) => make("span", { class: "word " + name }, name);

  // A mark as the page has drawn it already.
  const sign = (suite, entrant) => {
    const svg = suite.node.querySelector(`tr[data-entrant="${entrant}"] .mark`);
    return svg ? svg.cloneNode(true) : "";
  };

  function controls(suite) {
    const place = suite.node.querySelector(".controls");
    const inputs = {};
    place.append(make("h4", {}, "Limits and budget"));
    LIMITS.forEach(([key, label, least, most]) => {
      const id = `limit-${suite.index}-${key}`;
      const own = suite.limits[key];
      const [low, high] = [Math.log(Math.min(least, own)), Math.log(Math.max(most, own))];
      const field = make("input", { id, type: "number", min: 0, step: "any", value: own, "data-limit": key });
      const slider = make("input", { type: "range", min: low, max: high, step: (high - low) / 400, "aria-label": label + ", slider", "data-slider": key });
      const follow = () => { const v = Number(field.value); if (v > 0) slider.value = Math.log(v); slider.setAttribute("aria-valuetext", field.value); };
      follow();
      field.addEventListener("input", () => { follow(); draw(suite); });
      slider.addEventListener("input", () => { field.value = Number(Math.exp(Number(slider.value)).toPrecision(3)); slider.setAttribute("aria-valuetext", field.value); draw(suite); });
      inputs[key] = { field, follow, own };
      place.append(make("div", { class: "control" }, make("label", { for: id }, label), make("div", {}, slider, field)));
    });
    const budget = (key, label) => {
      const id = `budget-${suite.index}-${key}`;
      const field = make("input", { id, type: "number", min: 0, step: "any", placeholder: "any", "data-budget": key, oninput: () => draw(suite) });
      place.append(make("div", { class: "control" }, make("label", { for: id }, label), field));
      return field;
    };
    const evaluations = budget("evaluations", "Evaluations, at most");
    const timed = suite.methods.some((method) => method.time !== null);
    const time = timed ? budget("time", "Time, at most [ratio to first-order Taylor]") : null;
    const id = `budget-${suite.index}-derivatives`;
    const derivatives = make("input", { id, type: "checkbox", checked: true, "data-budget": "derivatives", onchange: () => draw(suite) });
    place.append(make("div", { class: "control" }, make("div", {}, derivatives, make("label", { for: id }, "Derivatives allowed"))));
    place.append(make("div", { class: "control" }, make("button", { type: "button", class: "plain", onclick: () => {
      for (const { field, follow, own } of Object.values(inputs)) { field.value = own; follow(); }
      evaluations.value = ""; if (time) time.value = ""; derivatives.checked = true; draw(suite);
    } }, "Back to the suite's own")));
    place.hidden = false;
    const optional = (field) => (field && field.value !== "" && Number(field.value) >= 0 ? Number(field.value) : null);
    return () => {
      const limits = { ...suite.limits };
      for (const [key, { field }] of Object.entries(inputs)) {
        const value = Number(field.value);
        const sound = field.value !== "" && value > 0;
        field.setAttribute("aria-invalid", String(!sound));
        if (sound) limits[key] = value;
      }
      return [limits, { evaluations: optional(evaluations), time: optional(time), derivatives: derivatives.checked }];
    };
  }

  function drawRanking(suite, found) {
    const body = suite.node.querySelector(".ranking tbody");
    found.ranking.forEach((r) => {
      const row = body.querySelector(`tr[data-entrant="${r.entrant}"]`);
      row.classList.toggle("off", !r.affordable);
      for (const name of ["trusted", "rejected", "undecided"]) {
        row.querySelector("." + name).textContent = `${percent(r[name], r.served)} (${r[name]})`;
      }
      const share = (count) => (r.served ? (100 * count) / r.served : 0) + "%";
      row.querySelector(".bar .t").style.width = share(r.trusted);
      row.querySelector(".bar .u").style.width = share(r.undecided);
      const breaks = r.breaks ? `${r.breaks[0]} (${percent(r.breaks[1], r.rejected)})` : "–";
      row.querySelector(".breaks").textContent = r.affordable ? breaks : "beyond the budget; " + breaks;
      body.append(row);
    });
    const [first] = found.ranking;
    const best = first && first.affordable && first.trusted > 0;
    const total = suite.cases.id.length;
    suite.node.querySelector(".live").textContent =
      (best ? `Trusted most often${budgeted(found.budget) ? " within the budget" : ""}: ${suite.methods[first.entrant].label}, in ${first.trusted} of ${first.served} cases (${percent(first.trusted, first.served)}).` : "No method within the budget is trusted in any case.") +
      ` No Gaussian should be trusted in ${found.beyond} of ${total} cases.` + (suite.thinned ? ` ${suite.thinned}` : "");
  }

  const budgeted = (b) => b.evaluations !== null || b.time !== null || !b.derivatives;

  function drawMaps(suite, found) {
    suite.maps.forEach((map, m) => {
      const table = suite.node.querySelector(`table[data-map="${m}"]`);
      map.cells.forEach((cell, c) => {
        const best = Judge.choice(suite, found, cell.cases);
        const beyond = cell.cases.filter((item) => found.floors[item] === "broken").length;
        const name = best ? suite.methods[best.entrant].label : "no method trusted";
        const label = `${cell.about}: ${name}${beyond ? "; floor above its limit" : ""}`;
        const td = table.querySelector(`td[data-cell="${c}"]`);
        let button = td.querySelector("button");
        if (!button) {
          button = make("button", { type: "button", class: "cell", "aria-pressed": "false", onclick: () => choose(suite, m, c) });
          button.addEventListener("keydown", (event) => walk(event, td));
          td.replaceChildren(button);
        }
        button.setAttribute("aria-label", label);
        button.title = label;
        button.replaceChildren(...(best ? [sign(suite, best.entrant), make("b", {}, suite.methods[best.entrant].code)] : [make("b", {}, "none")]));
        if (beyond) button.append(make("span", { class: "beyond" }, "!"));
      });
    });
    if (suite.chosen) detail(suite, found);
  }

  // Arrow keys go from cell to cell.
  function walk(event, td) {
    const step = { ArrowLeft: [0, -1], ArrowRight: [0, 1], ArrowUp: [-1, 0], ArrowDown: [1, 0] }[event.key];
    if (!step) return;
    const row = td.parentElement.parentElement.rows[td.parentElement.sectionRowIndex + step[0]];
    const next = row && row.cells[td.cellIndex + step[1]];
    const button = next && next.querySelector("button");
    if (button) { event.preventDefault(); button.focus(); }
  }

  function choose(suite, m, c) {
    suite.chosen = [m, c];
    for (const button of suite.node.querySelectorAll(".map button")) {
      button.setAttribute("aria-pressed", String(button.closest("table").dataset.map === String(m) && button.parentElement.dataset.cell === String(c)));
    }
    detail(suite, suite.found);
  }

  const HEADINGS = ["Mean error", "Least variance ratio", "Greatest variance ratio", "Cross-cov. error", "NEES ratio", "Excess [nats]"];

  function decided(verdict) {
    const f = verdict.finding;
    if (!f) return verdict.fault || "every limit is kept";
    const side = f.upper ? "at most" : "at least";
    const how = verdict.name === "rejected" ? `${f.fault}, by a factor of ${f.factor.toFixed(2)}` : `${f.key.replace(/_/g, " ")} too near its limit to tell, or undefined`;
    return `${how} (${side} ${f.limit})`;
  }

  function scoreCells(suite, row) {
    return Judge.SCORES.map((_, k) => {
      const [value, se] = Judge.estimate(suite, row, k);
      return make("td", { class: "n", title: number(value) + error(se) }, number(value) + error(se));
    });
  }

  function detail(suite, found) {
    const [m, c] = suite.chosen;
    const cell = suite.maps[m].cells[c];
    const place = suite.node.querySelector(".detail");
    const count = suite.methods.length;
    const parts = [make("h4", {}, `${suite.maps[m].family}: ${cell.about}`)];
    for (const item of cell.cases.slice(0, 12)) {
      const floor = suite.floors[2 * item];
      const told = Number.isNaN(floor) ? "not defined" : number(floor) + error(suite.floors[2 * item + 1]) + " nats, " + found.floors[item];
      const body = make("tbody");
      suite.methods.forEach((method, entrant) => {
        const row = item * count + entrant;
        const verdict = found.verdicts[row];
        const work = Judge.work(suite, row);
        body.append(make("tr", {}, make("th", { scope: "row" }, sign(suite, entrant), " ", method.label), make("td", {}, word(verdict.name)), make("td", { class: "why" }, suite.rows.reason[row] || decided(verdict)), make("td", { class: "n" }, work === null ? "–" : String(work)), ...scoreCells(suite, row)));
      });
      const head = ["Method", "Verdict", "What decides", "Work", ...HEADINGS].map((text) => make("th", { scope: "col" }, text));
      parts.push(make("p", {}, make("b", {}, suite.cases.id[item]), ` (${suite.cases.about[item]}). Reference ${suite.cases.soundness[item]}. Floor ${told}.`));
      parts.push(make("div", { class: "scroll", tabindex: 0, role: "region", "aria-label": "Numbers of case " + suite.cases.id[item] }, make("table", {}, make("thead", {}, make("tr", {}, ...head)), body)));
    }
    if (cell.cases.length > 12) parts.push(make("p", {}, `${cell.cases.length - 12} more cases at this point stand in the table of cases.`));
    place.replaceChildren(...parts);
    place.hidden = false;
  }

  const COLUMNS = ["Case", "Family", "Method", "Verdict", "What decides", ...HEADINGS, "Floor [nats]"];

  function caseTable(suite) {
    const place = suite.node.querySelector(".cases");
    const state = { sort: 0, down: false, shown: PAGE, family: "", method: "", verdict: "", text: "" };
    const pick = (key, label, options) => {
      const select = make("select", { "data-filter": key, onchange: (event) => { state[key] = event.target.value; state.shown = PAGE; fill(); } }, make("option", { value: "" }, "all"), ...options.map(([value, text]) => make("option", { value }, text)));
      return make("label", {}, label, select);
    };
    const search = make("input", { type: "search", "data-filter": "text", oninput: (event) => { state.text = event.target.value.toLowerCase(); state.shown = PAGE; fill(); } });
    const filters = make("div", { class: "filters" },
      pick("family", "Family", suite.families.map((family, k) => [String(k), family])),
      pick("method", "Method", suite.methods.map((method, k) => [String(k), method.label])),
      pick("verdict", "Verdict", ["trusted", "rejected", "undecided", "skipped"].map((name) => [name, name])),
      make("label", {}, "Case or setting contains", search));
    const heads = COLUMNS.map((text, k) => make("th", { scope: "col", "aria-sort": k === 0 ? "ascending" : "none" }, make("button", { type: "button", onclick: () => { state.down = state.sort === k ? !state.down : false; state.sort = k; heads.forEach((head, i) => head.setAttribute("aria-sort", i !== k ? "none" : state.down ? "descending" : "ascending")); fill(); } }, text)));
    const body = make("tbody");
    const told = make("p", { role: "status", "aria-live": "polite", class: "told" });
    const more = make("button", { type: "button", class: "plain more", onclick: () => { state.shown += 10 * PAGE; fill(); } }, "Show more rows");
    const id = `cases-${suite.index}`;
    place.append(make("h4", { id }, "Cases"), filters, told, make("div", { class: "scroll", tabindex: 0, role: "region", "aria-labelledby": id }, make("table", {}, make("thead", {}, make("tr", {}, ...heads)), body)), more);
    place.hidden = false;
    const count = suite.methods.length;
    const key = (row) => {
      const item = Math.floor(row / count);
      const k = state.sort;
      if (k === 0) return row;
      if (k === 1) return suite.families[suite.cases.family[item]];
      if (k === 2) return row % count;
      if (k === 3) return suite.found.verdicts[row].name;
      if (k === 4) return suite.rows.reason[row] || decided(suite.found.verdicts[row]);
      return k < 11 ? Judge.estimate(suite, row, k - 5)[0] : suite.floors[2 * item];
    };
    function fill() {
      let rows = suite.found.verdicts.map((_, row) => row).filter((row) => {
        const item = Math.floor(row / count);
        return (state.family === "" || suite.cases.family[item] === Number(state.family)) && (state.method === "" || row % count === Number(state.method)) && (state.verdict === "" || suite.found.verdicts[row].name === state.verdict) && (state.text === "" || (suite.cases.id[item] + " " + suite.cases.about[item]).toLowerCase().includes(state.text));
      });
      const keyed = rows.map((row) => [key(row), row]);
      // What has no number stands last, whichever way.
      const blank = (x) => typeof x === "number" && Number.isNaN(x);
      keyed.sort(([x, i], [y, j]) => blank(x) - blank(y) || (state.down ? -1 : 1) * (x < y ? -1 : x > y ? 1 : 0) || i - j);
      told.textContent = `${keyed.length} rows of ${suite.found.verdicts.length}, ${Math.min(state.shown, keyed.length)} shown.`;
      more.hidden = keyed.length <= state.shown;
      body.replaceChildren(...keyed.slice(0, state.shown).map(([, row]) => {
        const item = Math.floor(row / count);
        const verdict = suite.found.verdicts[row];
        return make("tr", { "data-row": row }, make("th", { scope: "row", title: suite.cases.about[item] }, suite.cases.id[item]), make("td", {}, suite.families[suite.cases.family[item]]), make("td", { class: "name" }, suite.methods[row % count].label), make("td", {}, word(verdict.name)), make("td", { class: "why" }, suite.rows.reason[row] || decided(verdict)), ...scoreCells(suite, row), make("td", { class: "n" }, number(suite.floors[2 * item]) + error(suite.floors[2 * item + 1])));
      }));
    }
    return fill;
  }

  function draw(suite) {
    const [limits, budget] = suite.asked();
    suite.found = Judge.view(suite, limits, budget);
    drawRanking(suite, suite.found);
    drawMaps(suite, suite.found);
    suite.fill();
  }

  document.documentElement.classList.add("scripted");
  for (const node of document.querySelectorAll("article.suite")) {
    const suite = { ...Judge.decoded(data.suites[node.dataset.suite]), node, index: node.dataset.suite, chosen: null };
    suite.asked = controls(suite);
    suite.fill = caseTable(suite);
    draw(suite);
  }
})();
