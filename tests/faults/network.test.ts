import { once } from 'node:events';
import http from 'node:http';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import type { Page } from '@playwright/test';
import Sqlite from 'better-sqlite3';
import { Caller, PASSWORD } from '../support/caller';
import { makeDevice, openBuild, planSeam, sealedPush } from '../support/people';
import { expect, test as base, TestServer } from '../e2e/server';

/** What stands between the phone and the server. Of the API only: the pages come from the service worker. */
type Weather = 'clear' | 'html' | '502' | 'hangs' | 'answers cut' | 'disk full' | 'redirects';

class Proxy {
	weather: Weather = 'clear';
	/** Requests to the API that met the present weather. */
	met = 0;
	readonly #server: http.Server;
	#upstream = '';

	private constructor() {
		this.#server = http.createServer((request, response) => {
			this.#pass(request, response);
		});
	}

	static async open(): Promise<Proxy> {
		const between = new Proxy();
		between.#server.listen(0, '127.0.0.1');
		await once(between.#server, 'listening');
		return between;
	}

	get url(): string {
		return `http://localhost:${(this.#server.address() as AddressInfo).port}`;
	}

	leadTo(upstream: string): void {
		this.#upstream = upstream;
	}

	close(): void {
		this.#server.closeAllConnections();
		this.#server.close();
	}

	#pass(request: http.IncomingMessage, response: http.ServerResponse): void {
		const weather = request.url?.startsWith('/api/') === true ? this.weather : 'clear';
		if (request.url?.startsWith('/api/') === true) this.met++;
		if (weather === 'hangs') return;
		if (weather === 'html') {
			response
				.writeHead(200, { 'content-type': 'text/html' })
				.end('<h1>Welcome to the airport</h1>');
			return;
		}
		if (weather === 'redirects') {
			response.writeHead(302, { location: '/sign-in' }).end();
			return;
		}
		if (weather === '502') {
			response.writeHead(502, { 'content-type': 'text/html' }).end('<h1>Bad gateway</h1>');
			return;
		}
		if (weather === 'disk full') {
			const body = JSON.stringify({ code: 'disk.full', says: 'The server’s disk is full.' });
			response.writeHead(507, { 'content-type': 'application/json' }).end(body);
			return;
		}
		const upstream = http.request(new URL(request.url ?? '/', this.#upstream), {
			method: request.method ?? 'GET',
			headers: request.headers
		});
		upstream.on('response', (answer) => {
			if (weather === 'answers cut') {
				// The server did it; nobody will hear.
				answer.resume();
				answer.on('end', () => response.socket?.destroy());
				return;
			}
			response.writeHead(answer.statusCode ?? 500, answer.headers);
			answer.pipe(response);
		});
		upstream.on('error', () => response.socket?.destroy());
		response.on('close', () => upstream.destroy());
		request.pipe(upstream);
	}
}

const test = base.extend<{ between: Proxy; behind: TestServer }>({
	// eslint-disable-next-line no-empty-pattern -- Playwright reads the fixtures from this pattern
	between: async ({}, use) => {
		const between = await Proxy.open();
		await use(between);
		between.close();
	},
	behind: async ({ between }, use) => {
		const server = await TestServer.start({ ORIGIN: between.url });
		between.leadTo(server.url);
		await use(server);
		await server.dispose();
	}
});
test.use({ viewport: { width: 412, height: 823 } });

async function openBench(page: Page, { url }: Proxy): Promise<{ seam: string }> {
	const caller = await Caller.registered({ url }, 'ana');
	const person = (await caller.person())?.id ?? '';
	const device = await makeDevice(person);
	const { build, opened, enrolled } = openBuild(device, 'Yarrow Two');
	const { seam, lines } = planSeam(device, build, 60);
	await caller.push(person, build, await sealedPush(device, build, [opened, enrolled, ...lines]));
	await page.goto(`${url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill('ana@example.org');
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
	await page.goto(`${url}/builds/${build}/bench/${seam}`);
	await count(page, 0);
	return { seam };
}

const driven = (page: Page) => page.getByRole('button', { name: /^driven \+\d/i });
const count = (page: Page, holes: number) =>
	expect(page.getByText(`${holes} of 60 driven`).first()).toBeVisible({ timeout: 15_000 });

function rowsOf(server: TestServer, seam: string): string[] {
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'), { readonly: true });
	try {
		const rows = db
			.prepare(`select text from entry where seam = ? and kind = 'holes.driven' order by n`)
			.all(seam) as { text: string }[];
		return rows.map(({ text }) =>
			JSON.stringify((JSON.parse(text) as { body: { holes: unknown } }).body.holes)
		);
	} finally {
		db.close();
	}
}

test('whatever answers in the server’s place, the bench goes on and everything arrives once', async ({
	page,
	between,
	behind
}) => {
	test.setTimeout(180_000);
	const { seam } = await openBench(page, between);
	await page.clock.install();
	const weathers: Weather[] = ['html', '502', 'redirects', 'disk full', 'answers cut', 'hangs'];
	let holes = 0;
	for (const weather of weathers) {
		between.weather = weather;
		between.met = 0;
		await driven(page).click();
		holes += 5;
		await count(page, holes);
		// The next press is another one only after a second; later tries become due.
		await page.clock.fastForward(1100);
		await expect
			.poll(
				async () => {
					await page.clock.fastForward(60_000);
					return between.met;
				},
				{ timeout: 30_000 }
			)
			.toBeGreaterThan(0);
		await expect(page.getByText(/\d waiting|sending/).first()).toBeVisible();
		await expect(page).toHaveURL(/\/bench\//);
	}
	between.weather = 'clear';
	await expect
		.poll(
			async () => {
				await page.clock.fastForward(60_000);
				return rowsOf(behind, seam);
			},
			{ timeout: 60_000 }
		)
		.toEqual([1, 6, 11, 16, 21, 26].map((from) => JSON.stringify([{ from, to: from + 4 }])));
});
