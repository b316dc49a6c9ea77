"use strict";
// The rule of the program, in the reader's browser: a limit is kept when value +- quantile * standard error is inside it,
// broken when that is wholly outside, else open. No part of a page is touched here.
const Judge = (() => {
  const SCORES = ["mean_error", "variance_ratio_low", "variance_ratio_high", "cross_covariance_error", "nees_ratio", "excess"];
  // Limit, score, whether it is an upper one, what breaking it says.
  const RULES = [
    ["mean_error", 0, true, "mean biased"],
    ["variance_ratio_low", 1, false, "variance too small"],
    ["variance_ratio_high", 2, true, "variance too large"],
    ["cross_covariance_error", 3, true, "cross-covariance off"],
    ["nees_ratio_low", 4, false, "update too cautious"],
    ["nees_ratio_high", 4, true, "update overconfident"],
    ["excess", 5, true, "excess"],
  ];

  function doubles(text) {
    const bytes = Uint8Array.from(atob(text), (c) => c.charCodeAt(0));
    const view = new DataView(bytes.buffer);
    return Float64Array.from({ length: bytes.length / 8 }, (_, k) => view.getFloat64(8 * k, true));
  }

  function decoded(suite) {
    return { ...suite, numbers: doubles(suite.scores), floors: doubles(suite.floors) };
  }

  function standing(value, error, upper, limit, quantile) {
    if (Number.isNaN(value)) return "open";
    const margin = quantile * error;
    const kept = upper ? value + margin <= limit : value - margin >= limit;
    const broken = upper ? value - margin > limit : value + margin < limit;
    return kept ? "kept" : broken ? "broken" : "open";
  }

  // Value and standard error of a score in a row.
  function estimate(suite, row, score) {
    const at = 2 * (row * SCORES.length + score);
    return [suite.numbers[at], suite.numbers[at + 1]];
  }

  const NAMES = { t: "trusted", r: "rejected", u: "undecided", s: "skipped" };

  // What is said of a row, and the limit that decided.
  function verdict(suite, row, limits) {
    if (suite.rows.fixed[row] === "1") {
      const name = NAMES[suite.rows.outcome[row]];
      return { name, fault: name === "rejected" ? "no Gaussian" : null, finding: null };
    }
    let broken = null;
    let open = null;
    for (const [key, score, upper, fault] of RULES) {
      const [value, error] = estimate(suite, row, score);
      const stands = standing(value, error, upper, limits[key], suite.quantile);
      const finding = { key, score, upper, fault, value, error, limit: limits[key] };
      if (stands === "open" && !open) open = finding;
      if (stands !== "broken") continue;
      finding.factor = upper ? value / limits[key] : limits[key] / value;
      // The excess sums up everything and names no direction: it leads only where it stands alone. Of equals the last.
      const leads = !broken || broken.key === "excess" || (key !== "excess" && finding.factor >= broken.factor);
      if (leads) broken = finding;
    }
    if (broken) return { name: "rejected", fault: broken.fault, finding: broken };
    if (open) return { name: "undecided", fault: null, finding: open };
    return { name: "trusted", fault: null, finding: null };
  }

  function floor(suite, item, limits) {
    if (suite.cases.doubt[item]) return "open";
    return standing(suite.floors[2 * item], suite.floors[2 * item + 1], true, limits.floor, suite.quantile);
  }

  function affords(suite, row, budget) {
    const method = suite.methods[row % suite.methods.length];
    if (budget.time !== null && method.time !== null && method.time > budget.time) return false;
    const cost = suite.costs[suite.rows.cost[row]];
    if (!cost) return true;
    const [values, jacobians, hessians, moments] = cost;
    if (budget.evaluations !== null && values + jacobians + hessians + moments > budget.evaluations) return false;
    return budget.derivatives || jacobians + hessians === 0;
  }

  function work(suite, row) {
    const cost = suite.costs[suite.rows.cost[row]];
    return cost ? cost[4] : null;
  }

  // Verdicts of all rows, counts of all methods, floors of all cases.
  function view(suite, limits, budget) {
    const count = suite.methods.length;
    const verdicts = Array.from({ length: suite.cases.id.length * count }, (_, row) => verdict(suite, row, limits));
    const floors = suite.cases.id.map((_, item) => floor(suite, item, limits));
    return { limits, budget, verdicts, floors, ranking: ranking(suite, verdicts, budget), beyond: floors.filter((f) => f === "broken").length };
  }

  function ranking(suite, verdicts, budget) {
    const count = suite.methods.length;
    const ranked = suite.methods.map((_, entrant) => {
      const r = { entrant, trusted: 0, rejected: 0, undecided: 0, skipped: 0, affordable: true, work: null, faults: new Map() };
      for (let row = entrant; row < verdicts.length; row += count) {
        const { name, fault } = verdicts[row];
        r[name] += 1;
        if (name === "skipped") continue;
        if (fault) r.faults.set(fault, (r.faults.get(fault) || 0) + 1);
        r.affordable = r.affordable && affords(suite, row, budget);
        const here = work(suite, row);
        if (here !== null) r.work = r.work === null ? here : Math.max(r.work, here);
      }
      // Of equals the last in the order of names.
      const first = [...r.faults].sort((a, b) => b[1] - a[1] || (a[0] < b[0] ? 1 : -1))[0];
      return { ...r, breaks: first || null, served: r.trusted + r.rejected + r.undecided };
    });
    const most = (r) => (r.work === null ? Infinity : r.work);
    const compare = (x, y) => (x === y ? 0 : x < y ? -1 : 1);
    return ranked.sort((a, b) => b.affordable - a.affordable || b.trusted - a.trusted || compare(most(a), most(b)) || a.entrant - b.entrant);
  }

  // The method of least work within the budget that is trusted in all of these cases; of equals the first.
  function choice(suite, found, cases) {
    const count = suite.methods.length;
    let best = null;
    suite.methods.forEach((_, entrant) => {
      let most = null;
      for (const item of cases) {
        const row = item * count + entrant;
        if (found.verdicts[row].name !== "trusted" || !affords(suite, row, found.budget)) return;
        const here = work(suite, row);
        if (here !== null) most = most === null ? here : Math.max(most, here);
      }
      if (most !== null && (!best || most < best.work)) best = { entrant, work: most };
    });
    return best;
  }

  return { RULES, SCORES, decoded, estimate, verdict, view, choice, affords, work };
})();
