"use strict";

/** An element with attributes and children; text is never taken for markup. */
function element(name, attributes = {}, ...children) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes)) {
    if (key.startsWith("on")) made.addEventListener(key.slice(2), value);
    else if (value !== undefined && value !== null) made.setAttribute(key, value);
  }
  made.append(...children.filter((child) => child !== null && child !== undefined));
  return made;
}

/** **Bold** and `code` of a description. */
function inline(text) {
  return (text || "").split(/(\*\*[^*]+\*\*|`[^`]+`)/).map((piece) => {
    if (piece.startsWith("**")) return element("strong", {}, piece.slice(2, -2));
    if (piece.startsWith("`")) return element("code", {}, piece.slice(1, -1));
    return piece;
  });
}

/** The paragraphs and lists of a description. */
function prose(text) {
  return (text || "").split(/\n{2,}/).filter(Boolean).map((part) => {
    const lines = part.split("\n");
    if (lines.every((line) => line.startsWith("- "))) {
      return element("ul", {}, ...lines.map((line) => element("li", {}, ...inline(line.slice(2)))));
    }
    return element("p", {}, ...inline(part.replaceAll("\n", " ")));
  });
}

const TOKEN = /"(?:[^"\\]|\\.)*"|-?\d[\d.eE+-]*|true|false|null|[{}[\],:]/g;

/** What fits in so many characters stays on one line. */
const WIDTH = 76;

/** A JSON text laid out anew, every token exactly as it came: a number read and written again might not be. */
function layout(text) {
  const tokens = text.match(TOKEN) || [];
  const out = [];
  let depth = 0;
  const line = () => out.push(["", "\n" + "  ".repeat(depth)]);
  const short = (from) => {
    let open = 0;
    let size = 0;
    for (let at = from; at < tokens.length && size < WIDTH; at += 1) {
      size += tokens[at].length + (tokens[at] === "," || tokens[at] === ":" ? 1 : 0);
      if (tokens[at] === "[" || tokens[at] === "{") open += 1;
      if (tokens[at] === "]" || tokens[at] === "}") open -= 1;
      if (open === 0) return size < WIDTH;
    }
    return false;
  };
  const flat = [];
  tokens.forEach((token, at) => {
    const inner = flat.at(-1);
    if (token === "{" || token === "[") {
      flat.push(inner || short(at));
      out.push(["", token]);
      depth += 1;
      if (!flat.at(-1) && tokens[at + 1] !== "}" && tokens[at + 1] !== "]") line();
    } else if (token === "}" || token === "]") {
      flat.pop();
      depth -= 1;
      if (!inner && tokens[at - 1] !== "{" && tokens[at - 1] !== "[") line();
      out.push(["", token]);
    } else if (token === ",") {
      out.push(["", inner ? ", " : ","]);
      if (!inner) line();
    } else if (token === ":") {
      out.push(["", ": "]);
    } else if (token.startsWith("\"")) {
      out.push([tokens[at + 1] === ":" ? "m" : "s", token]);
    } else {
      out.push([/^[-\d]/.test(token) ? "n" : "w", token]);
    }
  });
  return out;
}

const plain = (parts) => parts.map(([, text]) => text).join("");
const coloured = (parts) => parts.map(([kind, text]) => (kind ? element("span", { class: kind }, text) : text));

/** Beyond this, laying out and colouring would make the page slow. */
const SHOWN = 200000;

const follow = (api, schema) => {
  const name = schema?.$ref?.split("/").at(-1);
  return name ? { ...api.components.schemas[name], ...(schema.description && { description: schema.description }) } : schema;
};

/** A schema's type in a few words. */
function kind(api, given, deep = 0) {
  const schema = follow(api, given) || {};
  if (schema.enum) return schema.enum.length > 8 ? "one of " + schema.enum.length + " names" : schema.enum.map((name) => JSON.stringify(name)).join(" | ");
  if (schema.type === "null") return "null";
  const either = schema.anyOf || schema.oneOf;
  if (either) return [...new Set(either.map((one) => kind(api, one, deep + 1)))].filter((one) => one !== "null").join(" or ");
  const types = [schema.type].flat().filter((type) => type && type !== "null");
  if (types[0] === "array" && deep < 4) {
    const size = schema.minItems !== undefined && schema.minItems === schema.maxItems ? schema.minItems + " × " : "list of ";
    return size + kind(api, schema.items, deep + 1);
  }
  const low = schema.exclusiveMinimum ?? schema.minimum;
  const bounds = low !== undefined && schema.maximum !== undefined
    ? ` ${schema.exclusiveMinimum === undefined ? "[" : "("}${low}, ${schema.maximum}]` : "";
  return (types.join(" or ") || "any") + bounds;
}

/** The object schemas that a schema is made of. */
function objects(api, given, deep = 0) {
  const schema = follow(api, given);
  if (!schema || deep > 6) return [];
  if (schema.properties) return [schema];
  const parts = [...(schema.anyOf || []), ...(schema.oneOf || []), ...(schema.allOf || []), ...(schema.items ? [schema.items] : [])];
  return parts.flatMap((part) => objects(api, part, deep + 1));
}

/** A table of members; nested ones are laid out when they are opened. */
function members(api, schema) {
  return objects(api, schema).map((object) => {
    const rows = Object.entries(object.properties).map(([name, member]) => {
      const inner = objects(api, member);
      const more = element("details", {}, element("summary", {}, "members"));
      more.addEventListener("toggle", () => more.childElementCount === 1 && more.append(...members(api, member)));
      const need = object.required?.includes(name) && object.additionalProperties === false;
      return element("tr", {},
        element("td", {}, element("code", {}, name), need ? element("span", { class: "need" }, "required") : null),
        element("td", {}, kind(api, member)),
        element("td", {}, ...inline(follow(api, member)?.description), inner.length ? more : null));
    });
    const head = ["Member", "Type", "Meaning"].map((text) => element("th", { scope: "col" }, text));
    return element("table", {}, element("thead", {}, element("tr", {}, ...head)), element("tbody", {}, ...rows));
  });
}

/** Request and answer of one operation, to try. */
function trial(api, method, path, operation) {
  const id = operation.operationId;
  const content = operation.requestBody?.content?.["application/json"];
  const example = content?.example ? plain(layout(JSON.stringify(content.example))) : "";
  const area = content && element("textarea", { id: `body-${id}`, spellcheck: "false", autocomplete: "off", rows: Math.min(28, example.split("\n").length + 1) });
  if (area) area.value = example;
  const inputs = (operation.parameters || []).map((parameter) => {
    const names = follow(api, parameter.schema)?.enum;
    const attributes = { id: `${id}-${parameter.name}`, autocomplete: "off" };
    const input = names
      ? element("select", attributes, ...["", ...names].map((name) => element("option", {}, name)))
      : element("input", attributes);
    input.value = parameter.in === "path" ? parameter.example ?? "" : "";
    return { parameter, input };
  });
  const parameters = inputs.length ? element("table", {}, element("tbody", {}, ...inputs.map(({ parameter, input }) => element("tr", {},
    element("td", {}, element("label", { for: input.id }, element("code", {}, parameter.name))), element("td", {}, input),
    element("td", {}, ...inline(parameter.description)))))) : null;
  const types = Object.keys(operation.responses?.["200"]?.content || {});
  const accept = types.length > 1 && element("select", { id: `accept-${id}` }, ...types.map((type) => element("option", {}, type)));

  const note = element("span", { class: "note", role: "status" });
  const status = element("div", { class: "line", role: "status", "aria-live": "polite" });
  const headers = element("pre", {});
  const more = element("details", { hidden: "" }, element("summary", {}, "Response headers"), headers);
  const body = element("pre", { tabindex: "0", "aria-label": "Response body" });

  const address = () => {
    const query = new URLSearchParams();
    let target = path;
    for (const { parameter, input } of inputs) {
      if (parameter.in === "path") target = target.replace(`{${parameter.name}}`, encodeURIComponent(input.value));
      else if (input.value) query.set(parameter.name, input.value);
    }
    return query.size ? `${target}?${query}` : target;
  };

  const show = async (send) => {
    send.disabled = true;
    note.textContent = "";
    const begun = performance.now();
    try {
      const request = { method: method.toUpperCase(), headers: {} };
      if (area) Object.assign(request, { body: area.value, headers: { "content-type": "application/json" } });
      if (accept) request.headers.accept = accept.value;
      const response = await fetch(address(), request);
      const text = await response.text();
      const took = performance.now() - begun;
      const compute = /compute;dur=([\d.]+)/.exec(response.headers.get("server-timing") || "")?.[1];
      status.replaceChildren(
        element("span", { class: response.ok ? "status" : "status bad" }, `${response.status} ${response.statusText}`),
        element("span", { class: "quiet" }, `${took.toFixed(1)} ms${compute ? `, of which ${compute} ms computing` : ""}`),
        element("span", { class: "quiet" }, `${new TextEncoder().encode(text).length.toLocaleString("en")} bytes`));
      headers.textContent = [...response.headers].map(([name, value]) => `${name}: ${value}`).join("\n");
      more.hidden = false;
      const json = (response.headers.get("content-type") || "").includes("json");
      if (json && text.length <= SHOWN) body.replaceChildren(...coloured(layout(text)));
      else body.textContent = text.length <= SHOWN ? text : `${text.slice(0, SHOWN)}\n… ${text.length - SHOWN} more characters`;
    } catch (error) {
      status.replaceChildren(element("span", { class: "status bad" }, "No answer"), element("span", {}, String(error)));
      body.replaceChildren();
    }
    send.disabled = false;
  };

  const send = element("button", { type: "button", class: "main", onclick: () => show(send) }, "Send");
  const curl = element("button", {
    type: "button",
    onclick: async () => {
      const data = area ? ` \\\n  -H 'content-type: application/json' -d '${area.value.replaceAll("'", "'\\''")}'` : "";
      const command = `curl -s '${location.origin}${address()}'${data}`;
      try {
        await navigator.clipboard.writeText(command);
        note.textContent = "Copied";
      } catch {
        body.textContent = command;
      }
    },
  }, "Copy as curl");
  const reset = area && element("button", { type: "button", onclick: () => { area.value = example; note.textContent = ""; } }, "Reset");
  if (area) {
    area.addEventListener("keydown", (event) => {
      if (event.key === "Enter" && (event.ctrlKey || event.metaKey)) show(send);
    });
    area.addEventListener("input", () => {
      try { JSON.parse(area.value); note.textContent = ""; } catch (error) { note.textContent = error.message; }
    });
  }
  const row = element("div", { class: "row" }, accept || null, send, reset, curl, note);
  const answer = element("div", { class: "answer" }, status, more, body);
  if (!area) return element("div", { class: "try plain" }, element("div", {}, parameters, row, answer));
  const label = element("label", { for: area.id, class: "hidden" }, `Body of ${path}`);
  return element("div", { class: "try" }, element("div", {}, label, area, row), answer);
}

function operation(api, method, path, item) {
  const badge = element("span", { class: `method ${method}` }, method.toUpperCase());
  const parts = [];
  const request = item.requestBody?.content?.["application/json"]?.schema;
  if (request) parts.push(element("details", {}, element("summary", {}, "Members of the request"), ...members(api, request)));
  const answer = item.responses?.["200"]?.content?.["application/json"]?.schema;
  if (answer && objects(api, answer).length) {
    parts.push(element("details", {}, element("summary", {}, "Members of the answer"), ...members(api, answer)));
  }
  return element("article", { class: "operation", id: item.operationId, "data-words": `${method} ${path} ${item.summary}`.toLowerCase() },
    element("header", {}, badge, element("span", { class: "path" }, path), element("h3", {}, item.summary || "")),
    ...prose(item.description), ...parts, trial(api, method, path, item));
}

function build(api) {
  document.title = `${api.info.title}: the interface`;
  document.getElementById("version").textContent = api.info.version;
  document.getElementById("about").replaceChildren(element("h1", {}, "The interface"), ...prose(api.info.description),
    element("p", {}, "The whole contract as ", element("a", { href: "/openapi.json" }, "OpenAPI 3.1"), "."));
  const groups = (api.tags || []).map((tag) => ({ ...tag, items: [] }));
  for (const [path, item] of Object.entries(api.paths)) {
    for (const [method, each] of Object.entries(item)) {
      const group = groups.find((known) => known.name === each.tags?.[0]) || groups.at(-1);
      group.items.push([method, path, each]);
    }
  }
  const filled = groups.filter((group) => group.items.length);
  document.getElementById("contents").replaceChildren(...filled.flatMap((group) => [
    element("h2", {}, group.name),
    element("ul", {}, ...group.items.map(([method, path, each]) => element("li", {},
      element("a", { href: `#${each.operationId}` }, element("span", { class: `method ${method}` }, method.toUpperCase()),
        element("span", { class: "path" }, path))))),
  ]));
  document.getElementById("operations").replaceChildren(...filled.map((group) => element("section", { class: "group" },
    element("h2", {}, group.name[0].toUpperCase() + group.name.slice(1)), element("p", {}, group.description || ""),
    ...group.items.map(([method, path, each]) => operation(api, method, path, each)))));
  if (location.hash) document.getElementById(location.hash.slice(1))?.scrollIntoView();
}

document.getElementById("filter").addEventListener("input", (event) => {
  const words = event.target.value.toLowerCase().split(/\s+/).filter(Boolean);
  for (const article of document.querySelectorAll(".operation")) {
    article.hidden = !words.every((word) => article.dataset.words.includes(word));
  }
  for (const group of document.querySelectorAll(".group")) {
    group.hidden = !group.querySelector(".operation:not([hidden])");
  }
});

const theme = document.getElementById("theme");
const paint = (dark) => {
  document.documentElement.dataset.theme = dark ? "dark" : "light";
  document.documentElement.style.colorScheme = dark ? "dark" : "light";
  theme.setAttribute("aria-pressed", String(dark));
};
theme.addEventListener("click", () => paint(document.documentElement.dataset.theme !== "dark"));
paint(matchMedia("(prefers-color-scheme: dark)").matches);

fetch("/openapi.json")
  .then((response) => response.json())
  .then(build)
  .catch((error) => {
    document.getElementById("operations").replaceChildren(element("p", { class: "status bad" }, `The interface cannot be read: ${error}`));
  });
