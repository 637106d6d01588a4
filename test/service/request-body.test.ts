import { gzipSync } from 'node:zlib';
import { describe, expect, test } from 'vitest';
import { inventedScenario, inventedTable } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const plain = JSON.stringify(inventedScenario());
const rates = (body: unknown, headers?: Record<string, string>) => app.post('/v1/rates', body, headers);
const zipped = (bytes: Uint8Array) => rates(bytes, { 'content-encoding': 'gzip' });
const expected = await (await rates(plain)).text();
const MIB = 2 ** 20;

describe('POST /v1/rates, media types', () => {
  test.each([
    'application/json',
    'Application/JSON',
    'application/json; charset=utf-8',
    'application/json;charset="UTF-8"',
    'application/vnd.invented+json',
  ])('POST /v1/rates: Content-Type %s is read', async (type) => {
    expect(await (await rates(plain, { 'content-type': type })).text()).toBe(expected);
  });

  test.each([
    '',
    'text/plain',
    'application/x-www-form-urlencoded',
    'multipart/form-data; boundary=x',
    'application/jsonp',
    'application/json; charset=utf-16',
    'application/json; charset=iso-8859-1',
    'text/json, application/json',
  ])('POST /v1/rates: Content-Type "%s" is 415', async (type) => {
    await problemOf(await rates(plain, { 'content-type': type }), 'media-type');
  });

  test('POST /v1/rates: no body and no Content-Type is 415, an empty one 400', async () => {
    await problemOf(await app.call('POST', '/v1/rates'), 'media-type');
    await problemOf(await rates(''), 'malformed-body');
  });

  test.each(['br', 'deflate', 'gzip, gzip', 'zstd', 'x'])(
    'POST /v1/rates: Content-Encoding %s is 415',
    async (encoding) => {
      await problemOf(await rates(plain, { 'content-encoding': encoding }), 'media-type');
    },
  );

  test.each<[string, boolean]>([
    ['application/json', true],
    ['*/*', true],
    ['application/*;q=0.1', true],
    ['text/html, application/json;q=0.1', true],
    ['text/html', false],
    ['application/json;q=0', false],
    ['application/json;q=0, */*', false],
  ])('POST /v1/rates: Accept "%s"', async (accept, served) => {
    const response = await rates(plain, { accept });
    if (served) expect(await response.text()).toBe(expected);
    else await problemOf(response, 'not-acceptable');
  });
});

describe('POST /v1/rates, bodies that cannot be read', () => {
  const deep = 200_000;
  const bytes = (...values: number[]): Uint8Array => Uint8Array.from(values);
  test.each<[string, string | Uint8Array]>([
    ['nothing but spaces', '   '],
    ['no JSON', 'hello'],
    ['a truncated body', plain.slice(0, -1)],
    ['half a body', plain.slice(0, plain.length / 2)],
    ['two bodies', plain + plain],
    ['a trailing comma', plain.replace(/}$/, ',}')],
    ['a comment', `// invented\n${plain}`],
    ['NaN', plain.replace('0.3', 'NaN')],
    ['Infinity', plain.replace('0.3', '-Infinity')],
    ['a hexadecimal number', plain.replace('0.3', '0x3')],
    ['single quotes', plain.replaceAll('"', "'")],
    ['a control character in a text', plain.replace('Invented', 'In\nvented')],
    ['lists 200,000 deep', '['.repeat(deep)],
    ['lists 200,000 deep and closed', '['.repeat(deep) + ']'.repeat(deep)],
    ['objects 200,000 deep', `${'{"a":'.repeat(deep)}1${'}'.repeat(deep)}`],
    ['a field 200,000 deep', plain.replace('"mass":"10 MeV"', `"mass":${'['.repeat(deep)}${']'.repeat(deep)}`)],
    ['Latin-1', bytes(0x22, 0xe9, 0x22)],
    ['UTF-16', bytes(0xff, 0xfe, 0x7b, 0x00, 0x7d, 0x00)],
    ['a truncated character', bytes(0x22, 0xe2, 0x82)],
  ])('POST /v1/rates: %s is 400', async (_what, body) => {
    await problemOf(await rates(body), 'malformed-body');
  });

  test('POST /v1/rates: brackets inside a text are no depth', async () => {
    const response = await rates(plain.replace('Invented numbers', `${'[{'.repeat(50)}\\"${'['.repeat(50)}`));
    expect(response.status).toBe(200);
  });

  test('POST /v1/rates: a byte order mark is no fault', async () => {
    expect(await (await rates(`\ufeff${plain}`)).text()).toBe(expected);
  });
});

describe('POST /v1/rates, gzip', () => {
  test('POST /v1/rates: a gzip body answers the bytes of the plain one', async () => {
    expect(await (await zipped(gzipSync(plain))).text()).toBe(expected);
  });

  test('POST /v1/rates: a body in two gzip members is one body', async () => {
    const half = plain.length / 2;
    const body = Buffer.concat([gzipSync(plain.slice(0, half)), gzipSync(plain.slice(half))]);
    expect(await (await zipped(body)).text()).toBe(expected);
  });

  const whole = gzipSync(plain);
  const flipped = Uint8Array.from(whole);
  flipped[whole.length - 6] ^= 0xff;
  test.each<[string, Uint8Array]>([
    ['truncated', whole.subarray(0, whole.length - 1)],
    ['truncated to half', whole.subarray(0, whole.length / 2)],
    ['truncated to its header', whole.subarray(0, 10)],
    ['of no bytes', new Uint8Array(0)],
    ['with garbage after it', Buffer.concat([whole, Buffer.from('garbage')])],
    ['with a broken checksum', flipped],
    ['that is plain JSON', Buffer.from(plain)],
    ['of no JSON', gzipSync('hello')],
  ])('POST /v1/rates: a gzip body %s is 400', async (_what, body) => {
    await problemOf(await zipped(body), 'malformed-body');
    expect(await (await rates(plain)).text()).toBe(expected);
  });
});

describe('POST /v1/crystals, size', () => {
  const filled = (bytes: number): string => {
    const text = JSON.stringify(inventedTable());
    return text + ' '.repeat(bytes - text.length);
  };

  test('POST /v1/crystals: 64 MiB decoded are read, one byte more is 413; plain and compressed', async () => {
    const [most, more] = [filled(64 * MIB), filled(64 * MIB + 1)];
    const gzip = { 'content-encoding': 'gzip' };
    expect((await app.post('/v1/crystals', most)).status).toBe(201);
    expect((await app.post('/v1/crystals', gzipSync(most), gzip)).status).toBe(200);
    await problemOf(await app.post('/v1/crystals', more), 'too-large');
    const bomb = gzipSync(more);
    expect(bomb.length).toBeLessThan(MIB);
    await problemOf(await app.post('/v1/crystals', bomb, gzip), 'too-large');
  });

  test('POST /v1/crystals: a declared length beyond the limit is 413 before anything is read', async () => {
    const response = await app.post('/v1/crystals', filled(1000), { 'content-length': String(64 * MIB + 1) });
    await problemOf(response, 'too-large');
  });
});
