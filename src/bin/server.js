// The server: our own http server around the handler SvelteKit builds. It exists for what the
// handler leaves to others: the headers of every answer, whoever gives it; streams ended and the
// database closed on a stop signal; one log line per request.
//
// The handler is another bundle. What both need to share hangs on one object of the process, see
// src/lib/server/process.ts.
import { randomUUID } from 'node:crypto';
import { existsSync } from 'node:fs';
import { createServer } from 'node:http';
import { setTimeout as sleep } from 'node:timers/promises';
import { fileURLToPath } from 'node:url';

/** @typedef {import('node:http').IncomingMessage} Request */
/** @typedef {import('node:http').ServerResponse} Response */
/** @typedef {(request: Request, response: Response) => Promise<void> | void} Handler */
/** @typedef {import('../lib/server/process').TallybarProcess} TallybarProcess */

const HANDLER = new URL('../../build/handler.js', import.meta.url);
const METHODS = ['GET', 'HEAD', 'POST', 'PUT', 'PATCH', 'DELETE', 'OPTIONS'];
/** Whoever runs the server gives it ten seconds at most, often five. */
const DRAIN_MS = 4000;

// A path in DATA_DIR is meant from the repository, from wherever the server is started.
process.chdir(fileURLToPath(new URL('../..', import.meta.url)));

const { handler, shared } = await load();
const { config, log } = shared;
if (config === undefined || log === undefined)
	throw new Error('the built app did not start itself');

const always = Object.entries({
	'X-Content-Type-Options': 'nosniff',
	'Referrer-Policy': 'same-origin',
	'Cross-Origin-Opener-Policy': 'same-origin',
	'Cross-Origin-Resource-Policy': 'same-origin',
	'Permissions-Policy': 'camera=(self), microphone=(self), geolocation=()',
	'X-Frame-Options': 'DENY',
	// For what SvelteKit sends without a policy of its own. A rendered page's header replaces this
	// one; a prerendered page carries its script rules in a meta tag, where frame-ancestors has no
	// effect.
	'Content-Security-Policy': "object-src 'none'; base-uri 'none'; frame-ancestors 'none'",
	// Service worker, manifest, shell and pages are asked for again each time; the handler replaces
	// this for files whose name changes with their content.
	'Cache-Control': 'no-cache',
	...(config.origin.startsWith('https:') && {
		'Strict-Transport-Security': 'max-age=31536000; includeSubDomains'
	})
});

const server = createServer((request, response) => {
	const started = performance.now();
	const id = randomUUID();
	// The app logs under the same id; one sent by the caller is not believed.
	request.headers['x-request-id'] = id;
	response.setHeader('X-Request-Id', id);
	for (const [name, value] of always) response.setHeader(name, value);
	const path = (request.url ?? '/').split('?', 1)[0] ?? '/';
	if (path.startsWith('/api/')) response.setHeader('Cache-Control', 'no-store');
	if (shared.draining) response.setHeader('Connection', 'close');
	response.on('close', () => {
		const line = {
			requestId: id,
			method: request.method,
			// The route, not the address: an address may hold the token of an invitation.
			route: shared.routes.get(request) ?? '(file)',
			status: response.statusCode,
			ms: Math.round(performance.now() - started),
			...(!response.writableFinished && { cut: true })
		};
		if (line.route === '(file)') log.debug(line, 'request');
		else log.info(line, 'request');
	});
	answer(request, response, path).catch((/** @type {unknown} */ error) => {
		log.error({ requestId: id, err: error }, 'request failed');
		if (response.headersSent) response.destroy();
		else plain(response, 500, 'The server met an error. What you sent was not kept.\n');
	});
});

// A slow caller may not hold a connection for ever; two minutes carry a photo over a weak network.
server.headersTimeout = 20_000;
server.requestTimeout = 120_000;
// Longer than the minute common proxies keep theirs open, so that it is they who close.
server.keepAliveTimeout = 65_000;

// What is not even HTTP never becomes a request; Node's own answer would carry no headers.
server.on('clientError', (/** @type {NodeJS.ErrnoException} */ error, socket) => {
	if (error.code === 'ECONNRESET' || !socket.writable) {
		socket.destroy();
		return;
	}
	const status =
		error.code === 'HPE_HEADER_OVERFLOW'
			? '431 Request Header Fields Too Large'
			: error.code === 'ERR_HTTP_REQUEST_TIMEOUT'
				? '408 Request Timeout'
				: '400 Bad Request';
	const headers = always.map(([name, value]) => `${name}: ${value}\r\n`).join('');
	socket.end(`HTTP/1.1 ${status}\r\n${headers}Content-Length: 0\r\nConnection: close\r\n\r\n`);
});

server.on('error', (/** @type {NodeJS.ErrnoException} */ error) => {
	if (error.code === 'EADDRINUSE') {
		refuse(`port ${config.port} is taken by another program; set PORT to a free one`);
	}
	refuse(error.message);
});

server.listen(config.port, config.host, () => {
	log.info({ port: config.port, host: config.host, origin: config.origin }, 'started');
	process.send?.({ origin: config.origin });
	// The channel to `npm start` must not keep a stopped server alive.
	process.channel?.unref();
});

process.on('SIGTERM', () => void stop('SIGTERM'));
process.on('SIGINT', () => void stop('SIGINT'));
process.on('disconnect', () => void stop('the starting process is gone'));
for (const event of /** @type {const} */ (['uncaughtException', 'unhandledRejection'])) {
	process.on(event, (/** @type {unknown} */ error) => {
		// Nothing is known about the state any more. A kill at any moment is safe, so end here.
		log.fatal({ err: error }, event);
		process.exit(1);
	});
}

/**
 * Loads the built app, which checks the configuration, opens the database and brings it up to date.
 *
 * @returns {Promise<{ handler: Handler, shared: TallybarProcess }>}
 */
async function load() {
	if (!existsSync(HANDLER)) refuse('there is no build yet; run npm start');
	const { env } = process;
	// An empty line of an .env file means "not set", also to the handler, which reads these itself.
	for (const name of ['PORT', 'ORIGIN', 'ADDRESS_HEADER', 'XFF_DEPTH']) {
		if (env[name] === '') Reflect.deleteProperty(env, name);
	}
	// Without ORIGIN the handler would believe the Host header. A port that is none is left for the
	// configuration to name.
	const port = Number(env['PORT'] ?? 3000);
	const origin = port >= 1 && port <= 65_535 ? `http://localhost:${port}` : undefined;
	Object.assign(env, {
		...(env['ORIGIN'] === undefined && origin !== undefined && { ORIGIN: origin }),
		// The handler's own default of 512 kB would refuse a push before our code sees it; each route
		// has its own, lower limit.
		BODY_SIZE_LIMIT: '12M'
	});
	try {
		/** @type {{ handler: Handler }} */
		const built = await import(HANDLER.href);
		/** @type {{ [key: symbol]: TallybarProcess | undefined }} */
		const holder = globalThis;
		const shared = holder[Symbol.for('tallybar.process')];
		if (shared === undefined) throw new Error('the built app did not start itself');
		return { handler: built.handler, shared };
	} catch (error) {
		return refuse(error instanceof Error ? error.message : String(error));
	}
}

/**
 * @param {string} reason
 * @returns {never}
 */
function refuse(reason) {
	process.stderr.write(`Tallybar cannot start: ${reason.split('\n', 1)[0] ?? reason}\n`);
	process.exit(1);
}

/**
 * @param {Request} request
 * @param {Response} response
 * @param {string} path
 */
async function answer(request, response, path) {
	if (!METHODS.includes(request.method ?? '')) {
		response.setHeader('Allow', METHODS.join(', '));
		plain(response, 405, 'This method is not allowed.\n');
	} else if (path === '/healthz') {
		// Alive: this process answers. Whether it can work is the question of /readyz.
		plain(response, 200, 'ok\n');
	} else {
		await handler(request, response);
	}
}

/**
 * @param {Response} response
 * @param {number} status
 * @param {string} text
 */
function plain(response, status, text) {
	response.statusCode = status;
	response.setHeader('Content-Type', 'text/plain; charset=utf-8');
	response.end(text);
}

/**
 * Stops: no new connections, streams ended, running requests finished, database closed, exit 0.
 *
 * @param {string} why
 */
async function stop(why) {
	if (shared.draining) return;
	shared.draining = true;
	log?.info({ why }, 'stopping');
	const drained = new Promise((resolve) => server.close(resolve));
	await runHooks(shared.whenDraining);
	// A kept-alive connection becomes idle only when its last answer is out.
	const idle = setInterval(() => {
		server.closeIdleConnections();
	}, 25);
	const inTime = await Promise.race([drained.then(() => true), sleep(DRAIN_MS).then(() => false)]);
	clearInterval(idle);
	if (!inTime) server.closeAllConnections();
	await runHooks(shared.whenDrained);
	log?.info({ inTime }, 'stopped');
	process.exit(0);
}

/** @param {Set<() => void | Promise<void>>} hooks */
async function runHooks(hooks) {
	for (const hook of [...hooks]) {
		try {
			await hook();
		} catch (error) {
			// One that fails must not keep the others, the database among them, from closing.
			log?.error({ err: error }, 'a step of stopping failed');
		}
	}
}
