import { createHash } from 'node:crypto';
import { html, Markup, scriptJson } from './markup.js';
import { STYLE } from './style.js';

interface Page {
  readonly title: string;
  readonly contents: readonly (readonly [id: string, name: string])[];
  readonly top: Markup;
  readonly body: readonly Markup[];
  readonly foot: string;
  readonly data: unknown; // read by the page's program
}

/**
 * A page in one file that fetches nothing: style, program and data stand in it. Its content-security policy lets exactly this
 * style and this program run, by their hashes, and nothing else; data is JSON, which does not run.
 */
export function page({ title, contents, top, body, foot, data }: Page, client: string): string {
  const program = client.replaceAll('</script', '<\\/script');
  const policy = [
    "default-src 'none'",
    `script-src '${hash(program)}'`,
    `style-src '${hash(STYLE)}'`,
    "base-uri 'none'",
    "form-action 'none'",
  ].join('; ');
  const links = contents.map(([id, name]) => html`<li><a href="#${id}">${name}</a></li>`);
  return html`<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="${policy}">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="generator" content="penstock">
<meta name="color-scheme" content="light dark">
<title>${title}</title>
<style>${new Markup(STYLE)}</style>
</head>
<body>
<a class="skip" href="#main">To the figures</a>
<nav aria-label="Contents"><ul>${links}</ul><label>Theme <select data-theme-choice><option value="auto">as the system</option><option value="light">light</option><option value="dark">dark</option></select></label></nav>
${top}<main id="main">
<noscript><p class="alarm">Charts need JavaScript; every figure also stands in the tables.</p></noscript>
${body}</main>
<footer><p>${foot}</p></footer>
<script type="application/json" id="data">${scriptJson(data)}</script>
<script>${new Markup(program)}</script>
</body>
</html>
`.text;
}

function hash(text: string): string {
  return `sha256-${createHash('sha256').update(text).digest('base64')}`;
}
