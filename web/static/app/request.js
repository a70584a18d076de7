/**
 * Ask the server, and give back its answer or its complaints in one shape.
 *
 * @typedef {{where: string, what: string}} Fault
 * @typedef {{ok: true, body: *, text: string, headers: Headers} | {ok: false, status: number, errors: Fault[]}} Answer
 */

const OUT_OF_REACH = "Loopwright's server does not answer; your work is kept in this page. Try again when it is back";

/**
 * @param {string} method
 * @param {string} url
 * @param {*} [body] sent as JSON
 * @param {Object<string, string>} [headers]
 * @returns {Promise<Answer>} never rejects
 */
export function ask(method, url, body, headers = {}) {
  return askWithText(method, url, body === undefined ? undefined : JSON.stringify(body), headers);
}

/**
 * The same with JSON that is text already; the server says where it cannot be read.
 *
 * @param {string} method @param {string} url @param {string} [body] @param {Object<string, string>} [headers]
 * @returns {Promise<Answer>} never rejects
 */
export async function askWithText(method, url, body, headers = {}) {
  let response;
  let text;
  try {
    response = await fetch(url, {
      method,
      headers: body === undefined ? headers : { "Content-Type": "application/json", ...headers },
      body,
    });
    text = await response.text();
  } catch {
    return { ok: false, status: 0, errors: [{ where: "", what: OUT_OF_REACH }] };
  }
  const parsed = parse(text, response.headers.get("Content-Type") ?? "");
  if (response.ok && parsed?.ok !== false) return { ok: true, body: parsed, text, headers: response.headers };
  const errors = Array.isArray(parsed?.errors) && parsed.errors.length > 0
    ? parsed.errors
    : [{ where: "", what: `the server answered ${response.status}` }];
  return { ok: false, status: response.status, errors };
}

function parse(text, type) {
  if (!type.includes("json")) return null;
  try {
    return JSON.parse(text);
  } catch {
    return null;
  }
}

/**
 * Let the server judge a design before it replaces the present one.
 *
 * @param {object} design
 * @returns {Promise<Fault[]>} what is wrong with it; empty when it can be used
 */
export async function faultsOf(design) {
  const answer = await ask("POST", "/api/assessment", design);
  return answer.ok ? [] : answer.errors;
}
