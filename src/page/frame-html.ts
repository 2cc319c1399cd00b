/** The page before the first word from the monitor, and the page that asks for the token. */
const head = (title: string, script: string) => `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<meta name="robots" content="noindex">
<title>${title}</title>
<link rel="icon" href="/assets/mark.svg" type="image/svg+xml">
<link rel="stylesheet" href="/assets/style.css">
<script type="module" src="/assets/${script}"></script>
</head>
`

export const pageHtml = `${head('Tautline', 'app.js')}<body>
<div id="page">
<header><h1>Tautline</h1><p class="quiet">Asking the monitor for its state.</p></header>
<noscript><p>This page needs JavaScript. The same state is at <a href="/state">/state</a> as JSON.</p></noscript>
</div>
</body>
</html>
`

/** `query`: what the login leads back to; URL-encoded. */
export const loginHtml = (
  note: string,
  query: string,
): string => `${head('Tautline: token', 'login.js')}<body>
<main class="login">
<h1>Tautline</h1>
<form method="post" action="/login${query}">
<p><label for="token">Token of this page</label></p>
<p><input id="token" name="token" type="password" autocomplete="current-password" required autofocus> <button>Look</button></p>
<p class="quiet" role="status">${note}</p>
<p class="quiet">It is the value of <code>page.token</code> in the settings of the monitor.</p>
</form>
</main>
</body>
</html>
`

/** A line, at rest and then higher: the mark of the page. */
export const markSvg = `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 32 32"><path d="M3 20h11l4-8h11" fill="none" stroke="#777" stroke-width="3.5" stroke-linecap="round" stroke-linejoin="round"/></svg>
`
