import { request as httpRequest } from 'node:http';
import { connect } from 'node:net';
import { once } from 'node:events';
import { expect, test, TestServer } from './server';

test('the front page works, and the headers stand on every kind of answer', async ({
	page,
	server
}) => {
	const failures: string[] = [];
	page.on('pageerror', (error) => failures.push(error.message));
	page.on('console', (message) => {
		if (message.type() === 'error') failures.push(message.text());
	});
	await page.goto(`${server.url}/`);
	await expect(page.getByRole('heading', { name: /^Every rivet/ })).toBeVisible();
	await page.getByRole('link', { name: 'My builds' }).click();
	await expect(page.getByRole('heading', { name: 'Nobody is signed in here' })).toBeVisible();
	expect(failures).toEqual([]);

	const shell = await (await fetch(`${server.url}/shell`)).text();
	const asset = /\/_app\/immutable\/[^"]+\.js/.exec(shell)?.[0];
	expect(asset).toBeDefined();
	const kinds: [path: string, status: number, cache: RegExp][] = [
		['/', 200, /^no-cache$/],
		['/shell', 200, /^no-cache$/],
		['/builds', 200, /^no-cache$/],
		['/service-worker.js', 200, /^no-cache$/],
		['/manifest.webmanifest', 200, /^no-cache$/],
		['/_app/version.json', 200, /^no-cache$/],
		[asset ?? '', 200, /immutable/],
		['/healthz', 200, /^no-cache$/],
		['/readyz', 200, /^no-cache$/],
		['/no/such/page', 404, /./],
		['/_app/immutable/gone.js', 404, /^(?!.*immutable)/],
		['/api/no/such/thing', 404, /./],
		['/.env', 404, /./],
		['/.git/config', 404, /./],
		['/%', 400, /./]
	];
	for (const [path, status, cache] of kinds) {
		const answer = await fetch(server.url + path);
		expect.soft(answer.status, path).toBe(status);
		const headers = answer.headers;
		expect.soft(headers.get('cache-control'), path).toMatch(cache);
		expect.soft(headers.get('x-content-type-options'), path).toBe('nosniff');
		expect.soft(headers.get('referrer-policy'), path).toBe('same-origin');
		expect.soft(headers.get('cross-origin-opener-policy'), path).toBe('same-origin');
		expect.soft(headers.get('cross-origin-resource-policy'), path).toBe('same-origin');
		expect.soft(headers.get('permissions-policy'), path).toContain('camera=(self)');
		expect.soft(headers.get('permissions-policy'), path).toContain('geolocation=()');
		expect.soft(headers.get('x-frame-options'), path).toBe('DENY');
		const policy = headers.get('content-security-policy');
		expect.soft(policy, path).toContain("object-src 'none'");
		expect.soft(policy, path).toContain("base-uri 'none'");
		expect.soft(policy, path).toContain("frame-ancestors 'none'");
		expect.soft(policy, path).not.toMatch(/script-src[^;]*unsafe|unsafe-eval/);
		expect.soft(headers.get('x-powered-by'), path).toBeNull();
	}
});

test('TRACE and what is not HTTP are refused, with the headers', async ({ server }) => {
	const request = httpRequest(`${server.url}/`, { method: 'TRACE' }).end();
	const [traced] = (await once(request, 'response')) as [import('node:http').IncomingMessage];
	traced.resume();
	expect(traced.statusCode).toBe(405);
	expect(traced.headers['x-content-type-options']).toBe('nosniff');

	const socket = connect(server.port, '127.0.0.1');
	socket.write('this is not http\r\n\r\n');
	let raw = '';
	for await (const chunk of socket) raw += String(chunk);
	expect(raw).toMatch(/^HTTP\/1\.1 400 /);
	expect(raw).toContain('X-Content-Type-Options: nosniff');
});

test('over https every answer asks for https from then on', async () => {
	const server = await TestServer.start({ ORIGIN: 'https://log.example.org' });
	try {
		for (const path of ['/', '/service-worker.js', '/no/such/page']) {
			const answer = await fetch(server.url + path);
			expect(answer.headers.get('strict-transport-security')).toContain('max-age=31536000');
		}
	} finally {
		await server.dispose();
	}
});

test('a wrong setting stops the start with one clear line', async () => {
	await expect(TestServer.start({ PORT: 'eighty' })).rejects.toThrow(
		/ended with 1: Tallybar cannot start: wrong setting: PORT: [^\n]+\n$/
	);
});

test('a stop signal ends it with 0 in under 5 s, also while callers hold connections', async ({
	server
}) => {
	// One kept alive and idle, one that never finishes its request.
	await fetch(`${server.url}/readyz`);
	const slow = connect(server.port, '127.0.0.1');
	await once(slow, 'connect');
	slow.on('error', () => undefined);
	slow.write('POST /builds HTTP/1.1\r\nHost: localhost\r\nContent-Length: 10\r\n\r\n');
	const started = Date.now();
	expect(await server.stop()).toBe(0);
	expect(Date.now() - started).toBeLessThan(5000);
	expect(server.log.map((line) => line.msg)).toEqual(
		expect.arrayContaining(['started', 'request', 'stopping', 'stopped'])
	);
	// Folded back into one file: nothing is left in a write-ahead log.
	const { readdirSync } = await import('node:fs');
	expect(readdirSync(server.dataDir).sort()).toEqual(['server-key.json', 'tallybar.db']);
});

test('the log names no address and no query', async ({ server }) => {
	await fetch(`${server.url}/secret-token-in-path?secret=in-query`);
	await server.restart();
	expect(JSON.stringify(server.log)).not.toContain('secret');
	expect(server.log.filter((line) => line.msg === 'request')).toHaveLength(1);
});
