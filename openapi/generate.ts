/** Writes openapi/openapi.json: `npm run openapi`. */
import fs from 'node:fs';
import { documentText } from './document.ts';

const { version } = JSON.parse(fs.readFileSync(new URL('../package.json', import.meta.url), 'utf8')) as {
  version: string;
};
fs.writeFileSync(new URL('./openapi.json', import.meta.url), documentText(version));
