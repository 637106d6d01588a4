import { describe, expect, test } from 'vitest';
import { ConfigError, configOf } from '../../service/config.ts';

describe('configOf', () => {
  test('configOf: the defaults that the contract states', () => {
    expect(configOf({})).toMatchObject({
      host: '127.0.0.1',
      port: 8087,
      dataDir: './data',
      deadlineSeconds: 60,
      corsOrigins: [],
      logLevel: 'info',
    });
    expect(configOf({}).workers).toBeGreaterThanOrEqual(1);
  });

  test('configOf: an empty variable counts as none', () => {
    const names = ['HOST', 'PORT', 'DATA_DIR', 'DEADLINE_S', 'CORS_ORIGINS', 'WORKERS', 'QUEUE', 'LOG_LEVEL'];
    expect(configOf(Object.fromEntries(names.map((name) => [name, ''])))).toEqual(configOf({}));
  });

  test.each([
    ['HOST', '0.0.0.0', { host: '0.0.0.0' }],
    ['PORT', '0', { port: 0 }],
    ['PORT', '65535', { port: 65_535 }],
    ['DATA_DIR', '/srv/tables', { dataDir: '/srv/tables' }],
    ['DEADLINE_S', '0.5', { deadlineSeconds: 0.5 }],
    ['WORKERS', '3', { workers: 3 }],
    ['QUEUE', '0', { queue: 0 }],
    ['LOG_LEVEL', 'silent', { logLevel: 'silent' }],
    ['CORS_ORIGINS', '*', { corsOrigins: ['*'] }],
    [
      'CORS_ORIGINS',
      'https://a.example, http://localhost:3000,',
      { corsOrigins: ['https://a.example', 'http://localhost:3000'] },
    ],
  ])('configOf: %s=%s', (name, value, expected) => {
    expect(configOf({ [name]: value })).toMatchObject(expected);
  });

  test.each([
    ['PORT', '-1'],
    ['PORT', '65536'],
    ['PORT', '80.5'],
    ['PORT', 'http'],
    ['PORT', ' '],
    ['PORT', 'NaN'],
    ['DEADLINE_S', '0'],
    ['DEADLINE_S', 'Infinity'],
    ['DEADLINE_S', '-5'],
    ['WORKERS', '0'],
    ['WORKERS', '1e9'],
    ['QUEUE', '-1'],
    ['TABLE_CACHE_MIB', 'lots'],
    ['LOG_LEVEL', 'loud'],
    ['CORS_ORIGINS', 'plots.example.org'],
    ['CORS_ORIGINS', 'https://plots.example.org/page'],
  ])('configOf: refuses %s=%s and names it', (name, value) => {
    expect(() => configOf({ [name]: value })).toThrow(ConfigError);
    expect(() => configOf({ [name]: value })).toThrow(new RegExp(`^${name}`));
  });

  test('configOf: tells every fault at once, one a line', () => {
    const faulty = { PORT: 'x', DEADLINE_S: '0', WORKERS: '0', QUEUE: '-1', LOG_LEVEL: 'loud', CORS_ORIGINS: 'a,b' };
    let message = '';
    try {
      configOf(faulty);
    } catch (error) {
      message = (error as ConfigError).message;
    }
    expect(message.split('\n').map((line) => line.split(/[=:]/)[0])).toEqual([
      'LOG_LEVEL',
      'CORS_ORIGINS',
      'CORS_ORIGINS',
      'PORT',
      'DEADLINE_S',
      'WORKERS',
      'QUEUE',
    ]);
  });
});
