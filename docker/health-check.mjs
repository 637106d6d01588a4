// Exits with 0 if the service in this container answers /healthz, with 1 and the reason otherwise.
const { HOST: host = '', PORT: port = '8087' } = process.env;
const loopback = { '': '127.0.0.1', '0.0.0.0': '127.0.0.1', '::': '[::1]' };
const name = loopback[host] ?? (host.includes(':') ? `[${host}]` : host);

try {
  const answer = await fetch(`http://${name}:${port}/healthz`, { signal: AbortSignal.timeout(4_000) });
  await answer.arrayBuffer();
  if (!answer.ok) throw new Error(`status ${answer.status}`);
} catch (error) {
  console.error(`unhealthy: ${error.cause?.message ?? error.message}`);
  process.exitCode = 1;
}
