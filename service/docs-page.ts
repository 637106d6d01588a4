/** /openapi.json and a page that shows it, from files of the service alone: no outside host is asked. */
import type { Hono } from 'hono';

export interface DocsPage {
  readonly style: string;
  readonly script: string;
}

const PAGE = `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>gramyear: HTTP interface</title>
<link rel="stylesheet" href="docs/style.css">
<link rel="icon" href="data:,">
</head>
<body>
<div id="document"></div>
<script src="docs/script.js"></script>
<script src="docs/start.js"></script>
</body>
</html>
`;

const START = `window.SwaggerUIBundle({
  url: 'openapi.json',
  dom_id: '#document',
  deepLinking: true,
  validatorUrl: null,
  defaultModelsExpandDepth: 0,
});
`;

/** There is one server and nobody signs in: no bar for either. */
const OWN_STYLE = '\n.swagger-ui .scheme-container { display: none }\n';

const POLICY =
  "default-src 'none'; script-src 'self'; style-src 'self' 'unsafe-inline'; img-src 'self' data:; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";

export function docsRoutes(app: Hono, docs: DocsPage, document: string): void {
  const serve = (path: string, mediaType: string, text: string): void => {
    app.get(path, (c) =>
      c.body(text, 200, { 'Content-Type': mediaType, 'Cache-Control': 'no-cache', 'Content-Security-Policy': POLICY }),
    );
  };
  serve('/openapi.json', 'application/json', document);
  serve('/docs', 'text/html; charset=utf-8', PAGE);
  serve('/docs/start.js', 'text/javascript; charset=utf-8', START);
  serve('/docs/script.js', 'text/javascript; charset=utf-8', docs.script);
  serve('/docs/style.css', 'text/css; charset=utf-8', docs.style + OWN_STYLE);
}
