"use strict";
// Moves and marks what the page holds; draws nothing of its own but what belongs to a picked parcel.
// All text from the data goes in as text, never as markup.
(() => {
  const D = JSON.parse(document.getElementById("data").textContent);
  const P = D.parcels, J = D.joint, N = P.label.length;
  const byId = (id) => document.getElementById(id);
  const side = (p) => (p < D.firstOfB ? 0 : 1);
  const speciesOf = (p) => D.species[side(p)];
  const SVG = "http://www.w3.org/2000/svg";
  document.documentElement.classList.add("scripted");

  /** A new element with attributes and children; texts become text. */
  function el(name, attributes, ...children) {
    const made = document.createElement(name);
    for (const [key, value] of Object.entries(attributes || {})) {
      if (value === true) made.setAttribute(key, "");
      else if (value !== false && value != null) made.setAttribute(key, value);
    }
    made.append(...children.filter((child) => child != null && child !== false));
    return made;
  }
  function draw(name, attributes, text) {
    const made = document.createElementNS(SVG, name);
    for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
    if (text != null) made.textContent = text;
    return made;
  }
  const bdi = (text) => el("bdi", {}, text);
  const button = (p) => {
    // Short names stay on one line; long ones may break anywhere.
    const short = P.label[p].length <= 20 ? " short" : "";
    return el("button", { type: "button", class: `parcel of-${"ab"[side(p)]}${short}`, "data-parcel": p }, bdi(P.label[p]));
  };
  const fixed = (x, digits) =>
    x == null ? "–" : x.toFixed(digits).replace(/^-(?=0\.?0*$)/, "").replace("-", "−");
  const interval = (c) => (c[2] === c[3] ? `${c[2]}` : `${c[2]}–${c[3]}`);
  const GLYPHS = { stable: "■", "one-sided": "◧", "cannot tell": "□", landmark: "◎", "no candidate": "–" };
  const VERDICTS = { conserved: "✓", displaced: "↷", undetermined: "?" };
  const standing = (p) => [el("span", { "aria-hidden": "true" }, GLYPHS[P.standing[p]] + " "), P.standing[p]];

  /** Verdicts on a parcel: rows of checks.csv that name it. */
  const checks = (() => {
    const found = Array.from({ length: N }, () => []);
    if (!D.checks) return found;
    const at = (name) => D.checks.header.indexOf(name);
    const [a, b, verdict, why, asked] = ["a", "b", "verdict", "why", "asked_from"].map(at);
    if (a < 0 || b < 0 || verdict < 0) return found;
    const index = [new Map(), new Map()];
    for (let p = 0; p < N; p++) index[side(p)].set(P.label[p], p);
    for (const row of D.checks.rows) {
      const pair = [index[0].get(row[a]), index[1].get(row[b])];
      for (const which of [0, 1]) {
        if (pair[which] == null) continue;
        const rest = D.checks.header
          .map((name, k) => [name, row[k]])
          .filter(([, cell], k) => ![a, b, verdict, why, asked].includes(k) && cell !== "");
        found[pair[which]].push({
          other: pair[1 - which], label: row[which ? a : b], verdict: row[verdict], why: row[why] || "", rest,
          from: D.species[["a", "b"].indexOf(row[asked])],
        });
      }
    }
    return found;
  })();

  /** Parcels that are marked together with a picked one: its partners, or its first candidates. */
  function mates(p) {
    const landmark = P.landmark[p];
    if (landmark != null) return D.landmarks[landmark].parcels[1 - side(p)];
    return D.candidates[p].filter((c) => c[1] <= 3 || c[9]).slice(0, 6).map((c) => c[0]);
  }

  // ---- The joint space ------------------------------------------------------------------------
  const phone = matchMedia("(max-width: 779px)");
  const view = { space: J.shown, x: 0, y: J.spaces[J.shown].axes.length > 1 ? 1 : 0, picked: -1 };
  const plots = [...document.querySelectorAll("svg[data-figure=joint-space]")].map((svg, layout) => {
    const number = (key) => Number(svg.dataset[key]);
    const parts = (name) => [...svg.querySelector("." + name).children];
    const picks = draw("g", { class: "picks" });
    svg.append(picks);
    return {
      svg, layout, picks, drawn: `${J.shown} 0 1`,
      left: number("left"), right: number("right"), top: number("top"), bottom: number("bottom"),
      radius: number("radius"),
      marks: parts("marks"), ellipses: parts("ellipses"), ties: parts("ties"), warnings: parts("warnings"),
      names: svg.querySelector(".names"), ticks: [parts("x-ticks"), parts("y-ticks")],
      titles: [svg.querySelector(".x-name"), svg.querySelector(".y-name")],
    };
  });
  const current = () => plots[phone.matches ? 1 : 0];
  const axes = () => J.spaces[view.space].axes;
  const scale = (axis, from, to) => (value) =>
    from + ((value - axis.range[0]) / (axis.range[1] - axis.range[0])) * (to - from);
  const hundredth = (x) => Math.round(x * 100) / 100;

  /** Where everyone lies on the axes in view, in the units of a drawing. */
  function places(plot) {
    const [ax, ay] = [axes()[view.x], axes()[view.y]];
    const [sx, sy] = [scale(ax, plot.left, plot.right), scale(ay, plot.bottom, plot.top)];
    return { x: ax.at.map(sx), y: ay.at.map(sy), sx, sy };
  }
  const placed = (plot) => plot.places || (plot.places = places(plot));

  /** Moves a drawing to the axes in view. */
  function turn(plot) {
    const wanted = `${view.space} ${view.x} ${view.y}`;
    if (plot.drawn === wanted) return;
    plot.drawn = wanted;
    plot.places = places(plot);
    const at = plot.places, both = [axes()[view.x], axes()[view.y]];
    both.forEach((axis, which) => {
      plot.titles[which].textContent = axis.name;
      const ticks = axis.ticks[plot.layout];
      plot.ticks[which].forEach((slot, k) => {
        const tick = ticks[k];
        slot.setAttribute("display", tick ? "inline" : "none");
        if (!tick) return;
        const [x, y] = which === 0 ? [at.sx(tick[0]), plot.bottom] : [plot.left, at.sy(tick[0])];
        slot.setAttribute("transform", `translate(${hundredth(x)} ${hundredth(y)})`);
        slot.lastElementChild.textContent = tick[1];
      });
    });
    const length = (s, error) => Math.abs(s(J.ellipse * error) - s(0));
    for (let p = 0; p < N; p++) {
      const [x, y] = [hundredth(at.x[p]), hundredth(at.y[p])];
      plot.marks[p].setAttribute("transform", `translate(${x} ${y})`);
      const ellipse = plot.ellipses[p];
      ellipse.setAttribute("cx", x);
      ellipse.setAttribute("cy", y);
      ellipse.setAttribute("rx", hundredth(length(at.sx, both[0].se[p])));
      ellipse.setAttribute("ry", hundredth(length(at.sy, both[1].se[p])));
    }
    let tie = 0, warning = 0;
    for (const landmark of D.landmarks) {
      for (const a of landmark.parcels[0]) {
        for (const b of landmark.parcels[1]) {
          plot.ties[tie++].setAttribute("d", `M${at.x[a]} ${at.y[a]}L${at.x[b]} ${at.y[b]}`);
        }
      }
      if (landmark.contradicted) {
        const [x, y] = middle(landmark, at);
        plot.warnings[warning++].setAttribute("transform", `translate(${x} ${y})`);
      }
    }
    const labels = ((J.spaces[view.space].labels[plot.layout][view.x] || [])[view.y]) || [];
    plot.names.replaceChildren();
    for (const [id, place] of labels) {
      const [x, y] = id < N ? [at.x[id], at.y[id]] : middle(D.landmarks[id - N], at);
      name(plot.names, id, x, y, J.places[place], id >= N);
    }
  }
  function middle(landmark, at) {
    const mean = (members, of) => members.reduce((sum, p) => sum + of[p], 0) / (members.length || 1);
    const half = (of) => (mean(landmark.parcels[0], of) + mean(landmark.parcels[1], of)) / 2;
    return [half(at.x), half(at.y)];
  }
  /** A line from a mark to its label further out. */
  const leader = (x, y, dx, dy) =>
    draw("path", { d: `M${x} ${y}L${x + 0.86 * dx} ${y + 0.86 * (dy - 3.25)}`, stroke: "#56626a", "stroke-width": 0.8 });
  /** A label at one of the places that are fixed for all drawings. */
  function name(group, id, x, y, [dx, dy, anchor, led], bold) {
    if (led) group.append(leader(x, y, dx, dy));
    const text = draw("text", {
      x: x + dx, y: y + dy, "text-anchor": anchor, fill: bold ? "#1d2427" : "#56626a",
      "font-weight": bold ? "bold" : "normal", stroke: "#fff", "stroke-width": 3,
      "stroke-linejoin": "round", "paint-order": "stroke", "data-id": id,
    }, J.texts[id]);
    group.append(text);
    return text;
  }

  /** Marks the picked parcel and its mates in a drawing, each with a label that keeps clear of the others. */
  function mark(plot) {
    const { svg, picks } = plot;
    picks.replaceChildren();
    for (const on of svg.querySelectorAll(".on")) on.classList.remove("on");
    svg.classList.toggle("dim", view.picked >= 0);
    if (view.picked < 0) return;
    const at = placed(plot), taken = [];
    const shown = [view.picked, ...mates(view.picked)];
    for (const p of [...shown].reverse()) {
      plot.ellipses[p].classList.add("on");
      plot.marks[p].classList.add("on");
      const copy = plot.marks[p].cloneNode();
      const size = p === view.picked ? 1.7 : 1.25;
      copy.setAttribute("transform", `${plot.marks[p].getAttribute("transform")} scale(${size})`);
      copy.setAttribute("stroke", "#1d2427");
      picks.append(copy);
      if (p === view.picked) {
        picks.append(draw("circle", {
          cx: at.x[p], cy: at.y[p], r: 2.6 * plot.radius + 3, fill: "none", stroke: "#1d2427", "stroke-width": 2,
        }));
      }
    }
    const room = plot.radius + 6, half = 1.6 * plot.radius;
    const marks = shown.map((p) => ({ p, x: at.x[p] - half, y: at.y[p] - half, width: 2 * half, height: 2 * half }));
    const meet = (one, other) => one.x < other.x + other.width && other.x < one.x + one.width && one.y < other.y + other.height && other.y < one.y + one.height;
    const texts = shown.map((p) => name(picks, p, at.x[p], at.y[p], J.places[0], true));
    // Asked once, and of all together: each question after a change lays the drawing out again.
    const widths = texts.map((text) => text.getComputedTextLength());
    const out = 1 + room / plot.radius / 4;
    shown.forEach((p, k) => {
      const [text, width] = [texts[k], widths[k]];
      let fits = false;
      for (let place = 0; place < J.places.length && !fits; place++) {
        const [dx, dy, anchor, led] = J.places[place];
        const [x, y] = [at.x[p] + (led ? dx : dx * out), at.y[p] + dy];
        const left = anchor === "start" ? x : anchor === "end" ? x - width : x - width / 2;
        const box = { x: left, y: y - 10, width, height: 14 };
        const inside = box.x > plot.left && left + width < plot.right && box.y > plot.top && box.y + box.height < plot.bottom;
        fits = inside && !taken.some((other) => meet(box, other)) && !marks.some((other) => other.p !== p && meet(box, other));
        if (!fits) continue;
        text.setAttribute("x", x);
        text.setAttribute("y", y);
        text.setAttribute("text-anchor", anchor);
        taken.push(box);
        if (led) text.before(leader(at.x[p], at.y[p], dx, dy));
      }
      if (!fits) text.remove();
    });
  }

  function refreshPlot() {
    const plot = current();
    turn(plot);
    mark(plot);
  }
  function nearest(plot, x, y, within) {
    const at = placed(plot);
    let best = -1, least = within * within;
    for (let p = 0; p < N; p++) {
      const d = (at.x[p] - x) ** 2 + (at.y[p] - y) ** 2;
      if (d < least) [best, least] = [p, d];
    }
    return best;
  }
  function pointed(svg, event) {
    const point = new DOMPoint(event.clientX, event.clientY).matrixTransform(svg.getScreenCTM().inverse());
    return [point.x, point.y];
  }
  const tip = el("div", { class: "tip", hidden: true, "aria-hidden": "true" });
  byId("plot").append(tip);
  for (const plot of plots) {
    plot.ellipses.forEach((ellipse, p) => ellipse.classList.toggle("of-landmark", P.landmark[p] != null));
    plot.svg.addEventListener("click", (event) => pick(nearest(plot, ...pointed(plot.svg, event), 18)));
    plot.svg.addEventListener("pointermove", (event) => {
      const p = nearest(plot, ...pointed(plot.svg, event), 12);
      tip.hidden = p < 0;
      if (p < 0) return;
      tip.replaceChildren(bdi(P.label[p]), ", ", bdi(speciesOf(p)));
      const box = byId("plot").getBoundingClientRect();
      tip.style.left = `${Math.min(Math.max(event.clientX - box.left, 70), box.width - 70)}px`;
      tip.style.top = `${event.clientY - box.top}px`;
    });
    plot.svg.addEventListener("pointerleave", () => { tip.hidden = true; });
  }
  /** The next parcel in a direction: near, and little to the side. */
  function neighbour(dx, dy) {
    const plot = current(), at = placed(plot);
    if (view.picked < 0) return nearest(plot, (plot.left + plot.right) / 2, (plot.top + plot.bottom) / 2, 1e6);
    const [x, y] = [at.x[view.picked], at.y[view.picked]];
    let best = view.picked, least = Infinity;
    for (let p = 0; p < N; p++) {
      const along = (at.x[p] - x) * dx + (at.y[p] - y) * dy;
      const aside = Math.abs((at.x[p] - x) * dy) + Math.abs((at.y[p] - y) * dx);
      if (p === view.picked || along <= 0.01 || aside > 2 * along + 1) continue;
      const cost = along + 2 * aside;
      if (cost < least) [best, least] = [p, cost];
    }
    return best;
  }
  const ARROWS = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, -1], ArrowDown: [0, 1] };
  byId("plot").addEventListener("keydown", (event) => {
    if (ARROWS[event.key]) {
      event.preventDefault();
      pick(neighbour(...ARROWS[event.key]));
    } else if (event.key === "Escape") pick(-1);
  });

  // ---- Controls of the joint space ------------------------------------------------------------
  J.spaces.forEach((space, k) => byId("alignment").append(el("option", { value: k }, space.name)));
  function offerAxes() {
    for (const [id, chosen] of [["axis-x", view.x], ["axis-y", view.y]]) {
      byId(id).replaceChildren(...axes().map((axis, k) => el("option", { value: k }, `${k + 1}: ${axis.verdict}`)));
      byId(id).value = chosen;
    }
  }
  byId("alignment").value = view.space;
  offerAxes();
  byId("alignment").addEventListener("change", (event) => {
    Object.assign(view, { space: Number(event.target.value), x: 0 });
    view.y = axes().length > 1 ? 1 : 0;
    offerAxes();
    refreshPlot();
  });
  for (const [id, key] of [["axis-x", "x"], ["axis-y", "y"]]) {
    byId(id).addEventListener("change", (event) => {
      view[key] = Number(event.target.value);
      refreshPlot();
    });
  }
  byId("ellipses").addEventListener("change", (event) => {
    for (const { svg } of plots) {
      for (const which of ["all", "landmarks", "none"]) svg.classList.toggle(`show-${which}`, event.target.value === which);
    }
  });
  phone.addEventListener("change", refreshPlot);
  addEventListener("beforeprint", () => plots.forEach((plot) => { turn(plot); mark(plot); }));

  // ---- One parcel looked over -----------------------------------------------------------------
  const table = (caption, heads, rows) =>
    el("table", {}, el("caption", { class: "unseen" }, caption),
      el("thead", {}, el("tr", {}, ...heads.map((head) => el("th", { scope: "col" }, head)))),
      el("tbody", {}, ...rows.map((cells) => el("tr", {}, ...cells.map((cell) => el("td", {}, ...[cell].flat()))))));
  const bar = (share) => {
    const fill = el("i", {});
    fill.style.width = `${Math.max(0, Math.min(1, share)) * 100}%`;
    return el("div", { class: "bar", "aria-hidden": "true" }, fill);
  };
  const most = [D.firstOfB, N - D.firstOfB];
  /** An interval of ranks on a logarithmic scale, and the rank itself. */
  function span(c, of) {
    const share = (rank) => (of > 1 ? Math.log(rank) / Math.log(of) : 0) * 96;
    const [line, rank] = [el("i", {}), el("b", {})];
    line.style.left = `${share(c[2])}%`;
    line.style.width = `${share(c[3]) - share(c[2])}%`;
    rank.style.left = `${share(c[1])}%`;
    return el("div", { class: "span", "aria-hidden": "true" }, line, rank);
  }
  const source = (text) => el("p", { class: "source" }, text);

  function card(p) {
    const body = [];
    const tags = [el("li", {}, bdi(speciesOf(p))), el("li", {}, ...standing(p))];
    for (const known of [P.group[p], P.hemisphere[p]]) if (known) tags.push(el("li", {}, bdi(known)));
    if (P.beyond[p] > 1) tags.push(el("li", { class: "warn" }, `▲ beyond every landmark (${fixed(P.beyond[p], 2)})`));
    if (P.doubt[p] != null && P.doubt[p] <= D.doubtful) tags.push(el("li", { class: "warn" }, `▲ doubt about a counterpart, p = ${fixed(P.doubt[p], 2)}`));
    if (P.tooLittle[p]) tags.push(el("li", { class: "warn" }, "▲ fewer connections than every landmark"));
    if (P.longName[p]) body.push(el("p", {}, bdi(P.longName[p])));
    body.push(el("ul", { class: "tags" }, ...tags));
    if (P.landmark[p] != null) body.push(...ofLandmark(D.landmarks[P.landmark[p]], side(p)));
    else body.push(...ofCandidates(p));
    body.push(...ofChecks(p), ...ofRank(p), ...ofInfluence(p));
    byId("card-title").replaceChildren(bdi(P.label[p]));
    byId("card-body").replaceChildren(...body);
  }
  function ofLandmark(landmark, which) {
    return [
      el("p", {}, "Belongs to the landmark ", el("strong", {}, bdi(landmark.name)), ": its counterpart was given, not found."),
      el("p", {}, "Given: ", ...landmark.parcels[1 - which].flatMap((p) => [button(p), " "])),
      el("p", {}, "Left out, the partner comes ",
        ...[0, 1].flatMap((k) => [k ? ", and " : "", `${landmark.leftOut[k][0]} of ${landmark.leftOut[k][1]} asked from `, bdi(D.species[k])]), "."),
      landmark.contradicted ? el("p", { class: "alarm" }, "▲ Contradicted by the other landmarks.") : null,
      source("landmarks.csv: rank_from_a, rank_from_b, contradicted"),
    ].filter(Boolean);
  }
  function ofCandidates(p) {
    const all = D.candidates[p];
    if (!all.length) return [el("p", {}, "No candidate is admissible.")];
    const of = most[1 - side(p)];
    const [first] = all, members = all.filter((c) => c[9]);
    const chance = first[8];
    const open = members.length === all.length ? " or more" : "";
    const parts = [
      el("p", {}, el("strong", {}, "First: "), button(first[0]),
        chance == null ? "" : `, chance ${fixed(chance, 2)}`, `, support ${fixed(first[5], 2)}, `,
        first[6] ? "each the other's first." : "not the first of its candidate."),
      ...candidateTables(all, of),
      source(`counterparts.csv: rank, rank_low, rank_high (scale logarithmic, 1 to ${of}), support, distance (1 = random pairs), in_candidate_set. Candidate set: ${members.length}${open}.`),
      el("h4", {}, "Which evidence puts whom first"),
    ];
    const by = D.kinds.map((kind, k) => [kind, all.filter((c) => c[7].includes(k)).map((c) => c[0])]);
    parts.push(by.length
      ? table("Kinds of evidence", ["Kind", "Its first"], by.map(([kind, firsts]) => [kind, firsts.length
        ? firsts.flatMap((c) => [button(c), c === first[0] ? " agrees" : " differs"]) : "none of those listed"]))
      : el("p", {}, "The run does not say."));
    parts.push(source("counterparts.csv: kinds_agreeing"));
    return parts;
  }
  function candidateTables(all, of) {
    const heads = ["Rank", "Candidate", "90 % of ranks", "Support", "Distance"];
    const cells = (c) => [`${c[1]}`, [button(c[0]), el("small", {}, c[9] ? "in set" : "not in set")],
      [span(c, of), interval(c)], [bar(c[5]), fixed(c[5], 2)], fixed(c[4], 2)];
    const near = table("First candidates", heads, all.slice(0, 5).map(cells));
    if (all.length <= 5) return [near];
    return [near, el("details", {}, el("summary", {}, `${all.length - 5} more`), table("Further candidates", heads, all.slice(5).map(cells)))];
  }
  function ofChecks(p) {
    const parts = [el("h4", {}, "Verdict")];
    for (const check of checks[p]) {
      parts.push(el("p", {}, el("strong", {}, `${VERDICTS[check.verdict] || "–"} `, bdi(check.verdict)), " with ",
        check.other == null ? bdi(check.label) : button(check.other),
        ...(check.from ? [", asked from ", bdi(check.from)] : []), check.why ? ". " : "", bdi(check.why)));
      if (check.rest.length) {
        parts.push(el("details", {}, el("summary", {}, "Its numbers"),
          table("Numbers of a check", ["Column", "Value"], check.rest.map(([key, cell]) => [bdi(key), bdi(short(cell))]))));
      }
    }
    if (!checks[p].length) {
      parts.push(el("p", { class: "hint" }, D.checks ? "Not among the pairs checked." : "No pair is checked yet; kinmark check on this run adds verdicts."));
    } else parts.push(source("checks.csv"));
    return parts;
  }
  /** A number of a table to four digits; anything else as it is. */
  const short = (cell) => (/^-?\d+\.\d{5,}$/.test(cell) ? String(Number(Number(cell).toPrecision(4))) : cell);
  function ofRank(p) {
    if (!D.rank) return [];
    const at = (key) => D.rank.header.indexOf(key);
    const row = D.rank.rows.find((r) => r[at("from")] === speciesOf(p) && r[at("parcel")] === P.label[p]);
    if (!row) return [];
    const shown = ["strength", "set_size", "p", "q"].filter((key) => at(key) >= 0).map((key) => `${key} ${short(row[at(key)])}`);
    return [el("h4", {}, "Against “no counterpart”"), el("p", {}, shown.join(" · ")), source("rank.csv")];
  }
  function ofInfluence(p) {
    const head = el("h4", {}, "Without each landmark");
    if (!D.influence) return [head, el("p", { class: "hint" }, "Not in this run: kinmark holdout on it adds influence.csv.")];
    const rows = D.influence.sets.map((set, k) => [set, D.influence.moved[k][p]]).filter(([, moved]) => moved);
    rows.sort((x, y) => y[1][0] - x[1][0]);
    const largest = Math.max(...rows.map(([, moved]) => moved[0]), 1e-12);
    const cells = ([set, [by, first, rank]]) => [bdi(set), [bar(by / largest), fixed(by, 3)],
      first == null ? "–" : rank === 1 ? "stays" : [button(first), ` (was first, then ${rank})`]];
    const heads = ["Left out", "Moves", "First then"];
    const changed = rows.filter(([, moved]) => moved[2] > 1).length;
    const parts = [head, el("p", {}, P.landmark[p] != null ? "How far it moves." : `Its first candidate changes without ${changed} of ${rows.length}.`),
      table("Largest movements", heads, rows.slice(0, 5).map(cells))];
    if (rows.length > 5) parts.push(el("details", {}, el("summary", {}, `${rows.length - 5} more`), table("Smaller movements", heads, rows.slice(5).map(cells))));
    parts.push(source("influence.csv: moved (1 = distance of random pairs), first_without, rank_without"));
    return parts;
  }

  // ---- The table of all parcels ---------------------------------------------------------------
  const ROWS = 100;
  const collator = new Intl.Collator("en", { numeric: true });
  const first = (p) => (D.candidates[p][0] && D.candidates[p][0][1] === 1 ? D.candidates[p][0] : null);
  const inSet = (p) => (first(p) ? D.candidates[p].filter((c) => c[9]).length : null);
  const ORDER = ["stable", "one-sided", "cannot tell", "no candidate", "landmark"];
  const KEYS = {
    parcel: (p) => P.label[p], group: (p) => P.group[p] || null, standing: (p) => ORDER.indexOf(P.standing[p]),
    first: (p) => first(p) && P.label[first(p)[0]], chance: (p) => first(p) && first(p)[8],
    support: (p) => first(p) && first(p)[5], interval: (p) => first(p) && first(p)[3] + first(p)[2] / 1e6,
    set: inSet, doubt: (p) => P.doubt[p], beyond: (p) => P.beyond[p],
    verdict: (p) => (checks[p].length ? checks[p][0].verdict : null),
  };
  const CELLS = {
    parcel: (p) => button(p), group: (p) => bdi(P.group[p]), standing: (p) => standing(p),
    first: (p) => (first(p) ? [button(first(p)[0]), first(p)[6] ? " ⇄" : ""] : "–"),
    chance: (p) => fixed(KEYS.chance(p), 2), support: (p) => fixed(KEYS.support(p), 2),
    interval: (p) => (first(p) ? interval(first(p)) : "–"), set: (p) => (inSet(p) == null ? "–" : `${inSet(p)}`),
    doubt: (p) => (P.doubt[p] != null && P.doubt[p] <= D.doubtful ? "▲ " : "") + fixed(P.doubt[p], 2),
    beyond: (p) => (P.beyond[p] > 1 ? "▲ " : "") + fixed(P.beyond[p], 2),
    verdict: (p) => (checks[p].length ? checks[p].map((c) => `${VERDICTS[c.verdict] || "–"} ${c.verdict}`).join(", ") : "–"),
  };
  const heads = [...document.querySelectorAll("#parcel-table thead th")];
  const body = document.querySelector("#parcel-table tbody");
  const sorted = { key: null, down: false };
  let from = 0, listed = [];

  function filtered() {
    const text = byId("search").value.trim().toLowerCase();
    const [species, kind, marked] = ["filter-species", "filter-standing", "filter-mark"].map((id) => byId(id).value);
    const found = [];
    for (let p = 0; p < N; p++) {
      if (species !== "" && side(p) !== Number(species)) continue;
      if (kind && P.standing[p] !== kind) continue;
      if (marked === "doubt" && !(P.doubt[p] != null && P.doubt[p] <= D.doubtful)) continue;
      if (marked === "little" && !P.tooLittle[p]) continue;
      if (marked === "beyond" && !(P.beyond[p] > 1)) continue;
      if (marked === "checked" && !checks[p].length) continue;
      if (text) {
        const words = [P.label[p], P.group[p], P.longName[p], first(p) ? P.label[first(p)[0]] : ""];
        if (!words.some((word) => word.toLowerCase().includes(text))) continue;
      }
      found.push(p);
    }
    if (sorted.key) {
      const of = KEYS[sorted.key], sign = sorted.down ? -1 : 1;
      found.sort((p, q) => {
        const [x, y] = [of(p), of(q)];
        // What has no value stands last either way.
        if (x == null || y == null) return (x == null) - (y == null) || p - q;
        return sign * (typeof x === "string" ? collator.compare(x, y) : x - y) || p - q;
      });
    }
    return found;
  }
  function list() {
    listed = filtered();
    from = Math.max(0, Math.min(from, listed.length - 1) - (Math.min(from, listed.length - 1) % ROWS));
    const shown = listed.slice(from, from + ROWS);
    body.replaceChildren(...shown.map((p) => el("tr", { "data-row": p }, ...heads.map((head, k) => {
      const key = head.dataset.key;
      return el(k ? "td" : "th", { scope: k ? null : "row", class: head.classList.contains("number") ? "number" : key === "standing" ? "word" : null }, ...[CELLS[key](p)].flat());
    }))));
    byId("counted").textContent = `${listed.length} of ${N} parcels` +
      (shown.length < listed.length ? `, of which rows ${from + 1} to ${from + shown.length} are shown` : "");
    byId("pages").hidden = shown.length === listed.length;
    byId("before").disabled = from === 0;
    byId("after").disabled = from + ROWS >= listed.length;
    markText(body);
  }
  for (const head of heads) {
    head.firstElementChild.addEventListener("click", () => {
      const numbers = head.classList.contains("number");
      if (sorted.key === head.dataset.key) sorted.down = !sorted.down;
      else Object.assign(sorted, { key: head.dataset.key, down: numbers && !["interval", "set", "doubt"].includes(head.dataset.key) });
      for (const other of heads) {
        const on = other === head;
        if (on) other.setAttribute("aria-sort", sorted.down ? "descending" : "ascending");
        else other.removeAttribute("aria-sort");
        other.querySelector(".arrow").textContent = on ? (sorted.down ? "▼" : "▲") : "";
      }
      page(0);
    });
  }
  /** Shows the rows from this one on. A page of them at a time: all at once would make every click wait. */
  function page(start) {
    from = start;
    list();
    body.closest(".scroll").scrollTop = 0;
  }
  byId("search").addEventListener("input", () => page(0));
  for (const id of ["filter-species", "filter-standing", "filter-mark"]) byId(id).addEventListener("change", () => page(0));
  byId("before").addEventListener("click", () => page(from - ROWS));
  byId("after").addEventListener("click", () => page(from + ROWS));
  body.addEventListener("click", (event) => {
    const row = event.target.closest("tr");
    if (row && !event.target.closest("button")) pick(Number(row.dataset.row));
  });

  /** A number as the tables write it: all digits, no exponent. */
  const plain = (x) => (x == null ? "" : /e/.test(String(x)) ? x.toFixed(20).replace(/0+$/, "") : String(x));
  const guarded = (text) => (/^[=+\-@\t\r]/.test(text) ? "'" + text : text);
  const quoted = (cell) => (/[",\n\r]/.test(cell) ? `"${cell.replace(/"/g, '""')}"` : cell);
  function csv() {
    const columns = [
      ["species", (p) => guarded(speciesOf(p))], ["parcel", (p) => guarded(P.label[p])],
      ["landmark", (p) => (P.landmark[p] == null ? "" : guarded(D.landmarks[P.landmark[p]].name))],
      ["hemisphere", (p) => P.hemisphere[p]], ["group", (p) => guarded(P.group[p])], ["long_name", (p) => guarded(P.longName[p])],
      ["standing", (p) => P.standing[p]], ["counterpart", (p) => (first(p) ? guarded(P.label[first(p)[0]]) : "")],
      ["mutual", (p) => (first(p) ? String(Boolean(first(p)[6])) : "")], ["chance", (p) => plain(KEYS.chance(p))],
      ["support", (p) => plain(KEYS.support(p))], ["rank_low", (p) => plain(first(p) && first(p)[2])],
      ["rank_high", (p) => plain(first(p) && first(p)[3])], ["distance", (p) => plain(first(p) && first(p)[4])],
      ["listed_in_candidate_set", (p) => plain(inSet(p))], ["no_counterpart_p", (p) => plain(P.doubt[p])],
      ["too_little_data", (p) => String(P.tooLittle[p])], ["beyond_landmarks", (p) => plain(P.beyond[p])],
    ];
    if (D.checks) columns.push(["verdict", (p) => guarded(checks[p].map((c) => c.verdict).join(";"))]);
    const lines = [columns.map(([key]) => key), ...listed.map((p) => columns.map(([, of]) => of(p)))];
    return lines.map((cells) => cells.map(quoted).join(",") + "\n").join("");
  }
  const say = (text) => { byId("said").textContent = text; };
  byId("copy").addEventListener("click", async () => {
    const text = csv();
    try {
      await navigator.clipboard.writeText(text);
    } catch {
      // Files opened from a disk may not be let near the clipboard: the old way.
      const area = el("textarea", { class: "unseen", "aria-hidden": "true" });
      area.value = text;
      document.body.append(area);
      area.select();
      document.execCommand("copy");
      area.remove();
    }
    byId("copy").textContent = "Copied";
    setTimeout(() => { byId("copy").textContent = "Copy as CSV"; }, 2000);
    say(`${listed.length} rows copied`);
  });
  byId("download").addEventListener("click", () => {
    const url = URL.createObjectURL(new Blob([csv()], { type: "text/csv" }));
    const link = el("a", { href: url, download: "parcels-shown.csv" });
    link.click();
    setTimeout(() => URL.revokeObjectURL(url), 10000);
  });

  // ---- The matrix -----------------------------------------------------------------------------
  const grids = [...document.querySelectorAll("svg[data-figure=matrix]")].map((svg) => {
    const number = (key) => Number(svg.dataset[key]);
    return { svg, left: number("left"), bottom: number("bottom"), across: number("across"), up: number("up"), guides: svg.querySelector(".guides") };
  });
  const placeOf = new Array(N);
  D.matrix.forEach((order) => order.forEach((p, k) => { placeOf[p] = k; }));
  const rankOf = (p, q) => { const c = D.candidates[p].find((found) => found[0] === q); return c ? `rank ${c[1]}` : "not listed"; };
  for (const grid of grids) {
    const cell = (event) => {
      const [x, y] = pointed(grid.svg, event);
      const [a, b] = [D.matrix[0][Math.floor((x - grid.left) / grid.across)], D.matrix[1][Math.floor((grid.bottom - y) / grid.up)]];
      return a == null || b == null ? null : [a, b];
    };
    grid.svg.addEventListener("pointermove", (event) => {
      const found = cell(event);
      if (!found) return;
      const [a, b] = found;
      byId("matrix-cell").replaceChildren(bdi(P.label[a]), " (", bdi(D.species[0]), ") and ", bdi(P.label[b]), " (", bdi(D.species[1]), "): ",
        `${rankOf(a, b)} from `, bdi(D.species[0]), `, ${rankOf(b, a)} from `, bdi(D.species[1]), ".");
    });
    grid.svg.addEventListener("click", (event) => { const found = cell(event); if (found) pick(found[0]); });
  }
  function guide() {
    const p = view.picked;
    for (const grid of grids) {
      grid.guides.setAttribute("display", p < 0 ? "none" : "inline");
      if (p < 0) continue;
      const pair = [];
      pair[side(p)] = p;
      pair[1 - side(p)] = mates(p)[0];
      const [row, column] = grid.guides.children;
      row.setAttribute("display", pair[1] == null ? "none" : "inline");
      column.setAttribute("display", pair[0] == null ? "none" : "inline");
      if (pair[1] != null) row.setAttribute("y", grid.bottom - (placeOf[pair[1]] + 1) * grid.up);
      if (pair[0] != null) column.setAttribute("x", grid.left + placeOf[pair[0]] * grid.across);
    }
  }

  // ---- Picking --------------------------------------------------------------------------------
  /** Marks buttons and rows of the picked parcel and of its mates. */
  function markText(within) {
    const near = new Set(view.picked < 0 ? [] : mates(view.picked));
    for (const old of within.querySelectorAll(".picked, .mate")) old.classList.remove("picked", "mate");
    if (view.picked < 0) return;
    for (const p of [view.picked, ...near]) {
      const word = p === view.picked ? "picked" : "mate";
      for (const found of within.querySelectorAll(`[data-parcel="${p}"], tr[data-row="${p}"]`)) found.classList.add(word);
    }
  }
  function pick(p) {
    view.picked = p;
    // What had the focus goes with the old card; a keyboard goes on from the new one.
    const within = byId("card-body").contains(document.activeElement);
    byId("card").classList.toggle("empty", p < 0);
    byId("find-fault").textContent = "";
    if (p < 0) {
      byId("card-title").textContent = "No parcel is picked";
      byId("card-body").replaceChildren();
      say("No parcel is picked");
    } else {
      card(p);
      byId("find").value = named(p);
      const c = first(p);
      say(`${P.label[p]} of ${speciesOf(p)}, ${P.standing[p]}` + (c ? `: first ${P.label[c[0]]}, rank ${interval(c)}, support ${fixed(c[5], 2)}` : ""));
    }
    if (within) byId("card-title").focus();
    mark(current());
    guide();
    markText(document.querySelector("main"));
  }
  const named = (p) => `${P.label[p]} – ${speciesOf(p)}`;
  byId("all-parcels").append(...P.label.map((_, p) => el("option", { value: named(p) })));
  /** The parcel that is meant by what was typed: its name with its species, its name, or the only one that begins or goes on so. */
  function meant(typed) {
    const text = typed.trim().toLowerCase();
    if (!text) return -1;
    for (const of of [named, (p) => P.label[p]]) {
      for (let p = 0; p < N; p++) if (of(p).toLowerCase() === text) return p;
    }
    const near = P.label.map((_, p) => p).filter((p) => P.label[p].toLowerCase().startsWith(text));
    return near.length === 1 ? near[0] : -1;
  }
  document.querySelector("form.find").addEventListener("submit", (event) => {
    event.preventDefault();
    const typed = byId("find").value, p = meant(typed);
    if (p >= 0) pick(p);
    else byId("find-fault").textContent = `No parcel is called “${typed}”.`;
  });
  byId("find").addEventListener("change", () => {
    const p = meant(byId("find").value);
    if (p >= 0 && p !== view.picked) pick(p);
  });
  byId("let-go").addEventListener("click", () => { byId("find").value = ""; pick(-1); });
  document.addEventListener("click", (event) => {
    const target = event.target.closest("button[data-parcel]");
    if (target) pick(Number(target.dataset.parcel));
  });

  list();
  refreshPlot();
})();
