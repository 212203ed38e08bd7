// SPDX-License-Identifier: GPL-3.0-or-later
// The live page: shows what the server drew. It computes nothing of the link and loads nothing from elsewhere.
"use strict";

const VIEWS = {
  ladder: "Measured and predicted rates",
  losses: "Where the decibels go",
  history: "Shortfall over time",
  decision_map: "Errors by decision cell",
  curve: "Error rate against Es/N0",
  account: "Account and verdict",
};
const THEMES = ["system", "light", "dark"];
// Layers of the decision map, each with its button, and whether they are shown at first.
const LAYERS = { labels: "off", samples: "on" };
const NARROW = matchMedia("(max-width: 519px)");
const STALE_SECONDS = 5;

const byId = (id) => document.getElementById(id);
const token = new URLSearchParams(location.search).get("token");
const withToken = (path, more = {}) => {
  const query = new URLSearchParams(token ? { ...more, token } : more).toString();
  return query ? `${path}?${query}` : path;
};

let held = false; // while it is, the newest of each event waits here
const waiting = new Map();
let source = null;
let reportAt = null;
let ended = false;
let saidBefore = "";

function element(name, className, text = "") {
  const made = document.createElement(name);
  if (className) made.className = className;
  made.textContent = text;
  return made;
}

function buildViews() {
  for (const [name, title] of Object.entries(VIEWS)) {
    const figure = document.createElement("figure");
    figure.id = name;
    const head = document.createElement("div");
    const heading = element("h2", "", title);
    heading.id = `${name}-title`;
    const enlarge = element("button", "enlarge", "Enlarge");
    enlarge.type = "button";
    enlarge.setAttribute("aria-pressed", "false");
    enlarge.setAttribute("aria-label", `Enlarge: ${title}`);
    enlarge.addEventListener("click", () => {
      const large = figure.classList.toggle("large");
      enlarge.setAttribute("aria-pressed", String(large));
      figure.scrollIntoView({ block: "nearest" });
    });
    head.append(heading, ...(name === "decision_map" ? layerButtons(figure) : []), enlarge);
    figure.setAttribute("aria-labelledby", heading.id);
    figure.append(head, element("div", "empty", "No picture yet"));
    byId("views").append(figure);
  }
}

function layerButtons(figure) {
  return Object.entries(LAYERS).map(([layer, first]) => {
    const button = element("button", "", layer[0].toUpperCase() + layer.slice(1));
    button.type = "button";
    button.id = `show-${layer}`;
    const show = (state) => {
      figure.dataset[layer] = state;
      button.setAttribute("aria-pressed", String(state === "on"));
    };
    button.addEventListener("click", () => {
      show(figure.dataset[layer] === "on" ? "off" : "on");
      keep(layer, figure.dataset[layer]);
    });
    show(kept(layer, ["on", "off"], first));
    return button;
  });
}

function showView(name, text) {
  const parsed = new DOMParser().parseFromString(text, "image/svg+xml").documentElement;
  if (parsed.nodeName !== "svg") return;
  // The view box alone sizes it; the style sheet says how wide.
  parsed.removeAttribute("width");
  parsed.removeAttribute("height");
  byId(name).lastElementChild.replaceWith(document.adoptNode(parsed));
}

function showSummary(text) {
  const said = JSON.parse(text);
  reportAt = performance.now();
  ended = Boolean(said.final);
  byId("log").hidden = byId("logs").hidden = !said.log;
  byId("set").textContent = said.set || "Link";
  byId("pattern").textContent = said.pattern || "";
  const states = said.answers.map((each) => each.state);
  document.title = `${states.includes("bad") ? "✕ " : states.includes("open") ? "○ " : ""}${said.set || "Link"}`;
  byId("answers").replaceChildren(
    ...said.answers.map((each) => {
      const card = element("li");
      card.dataset.state = each.state;
      card.append(element("span", "question", each.question), element("span", "answer", each.answer), element("span", "detail", each.detail));
      return card;
    }),
  );
  // Read aloud only what changed in kind, not every digit.
  const spoken = said.answers[0].answer + (states.includes("bad") ? ". Something is wrong." : ".");
  if (spoken !== saidBefore) byId("spoken").textContent = saidBefore = spoken;
  showNews();
}

// What link_log has put aside by now, each time the list is opened.
async function listLogs() {
  if (!byId("logs").open) return;
  const list = byId("logs").lastElementChild;
  const say = (text) => list.replaceChildren(element("li", "", text));
  try {
    const answer = await fetch(withToken("logs"));
    if (!answer.ok) throw new Error(answer.statusText);
    const aside = (await answer.json()).filter((each) => each.path !== "log");
    if (!aside.length) return say("None was put aside");
    list.replaceChildren(
      ...aside.map((each) => {
        const item = element("li");
        const link = element("a", "", `${each.file} (${each.bytes} bytes)`);
        link.href = withToken(each.path);
        item.append(link);
        return item;
      }),
    );
  } catch {
    say("The list cannot be had");
  }
}

function showNews() {
  const news = byId("news");
  const age = reportAt === null ? null : Math.floor((performance.now() - reportAt) / 1000);
  const connected = source && source.readyState === EventSource.OPEN;
  let state = "wait";
  let text = "Waiting for the first report";
  if (held) text = "Held still";
  else if (!connected) [state, text] = ["lost", reportAt === null ? "No connection; trying again" : `No connection for the last figures, ${age} s old; trying again`];
  else if (ended) text = "The run has ended; these are its last figures";
  else if (age !== null && age >= STALE_SECONDS) text = `No report for ${age} s`;
  else if (age !== null) [state, text] = ["live", "Live"];
  news.dataset.state = state;
  if (news.textContent !== text) news.textContent = text;
}

function take(name, show) {
  return (event) => {
    if (held) waiting.set(name, () => show(event.data));
    else show(event.data);
  };
}

function connect() {
  if (source) source.close();
  source = new EventSource(withToken("events", { layout: NARROW.matches ? "narrow" : "wide" }));
  source.addEventListener("summary", take("summary", showSummary));
  for (const name of Object.keys(VIEWS)) source.addEventListener(name, take(name, (text) => showView(name, text)));
  source.onopen = source.onerror = showNews;
}

function setTheme(theme) {
  document.documentElement.dataset.theme = theme;
  byId("theme").textContent = `Colours: ${theme}`;
  keep("colours", theme);
}

function keep(name, value) {
  try {
    localStorage.setItem(name, value);
  } catch {
    // A browser that keeps nothing still shows it.
  }
}

function kept(name, values, first) {
  try {
    const found = localStorage.getItem(name);
    return values.includes(found) ? found : first;
  } catch {
    return first;
  }
}

buildViews();
setTheme(kept("colours", THEMES, "system"));
byId("theme").addEventListener("click", () => setTheme(THEMES[(THEMES.indexOf(document.documentElement.dataset.theme) + 1) % THEMES.length]));
byId("pause").addEventListener("click", () => {
  held = !held;
  byId("pause").setAttribute("aria-pressed", String(held));
  byId("pause").textContent = held ? "Go on" : "Hold still";
  document.body.classList.toggle("held", held);
  if (!held) for (const show of waiting.values()) show();
  waiting.clear();
  showNews();
});
byId("report").href = withToken("report");
byId("log").href = withToken("log");
byId("logs").addEventListener("toggle", listLogs);
NARROW.addEventListener("change", connect);
setInterval(showNews, 1000);
connect();
