import { readdirSync, readFileSync } from 'node:fs';
import { createServer } from 'node:http';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import type { Page } from '@playwright/test';
import Sqlite from 'better-sqlite3';
import { Caller, PASSWORD } from '../support/caller';
import { expect, test, TestServer } from './server';

const NEW = 'doubler rib nose skin';
const EVIL = 'http://evil.test';

type Fields = Record<string, string>;

/** Everything the accounts keep, to see that something changed nothing. */
function dump(server: TestServer): unknown {
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'), { readonly: true });
	try {
		return ['person', 'session', 'sign_in_try'].map((table) =>
			db.prepare(`select * from ${table} order by 1`).all()
		);
	} finally {
		db.close();
	}
}

async function fillIn(page: Page, fields: Fields): Promise<void> {
	for (const [label, value] of Object.entries(fields)) {
		await page.getByRole('textbox', { name: label }).fill(value);
	}
}

const emailField = (page: Page) => page.getByRole('textbox', { name: 'E-mail address' });

test('a person registers, signs out and signs in again, and every device can ask who it is', async ({
	page,
	server
}) => {
	const whoIsIt = () =>
		page.evaluate(async () => {
			const answer = await fetch('/api/session');
			return { status: answer.status, body: (await answer.json()) as unknown };
		});

	await page.goto(`${server.url}/register`);
	await fillIn(page, {
		'Your name': 'Erna',
		'E-mail address': 'Erna@example.org',
		Password: 'password123456789'
	});
	await page.getByRole('button', { name: 'Register' }).click();
	await expect(page.getByText('among the first anybody would try')).toBeVisible();
	await expect(emailField(page)).toHaveValue('Erna@example.org');
	await expect(page.getByRole('textbox', { name: 'Password' })).toHaveValue('');
	await expect(page.getByRole('textbox', { name: 'Password' })).toBeFocused();

	await fillIn(page, { Password: PASSWORD });
	await page.getByRole('button', { name: 'Register' }).click();
	await page.waitForURL('**/builds');
	expect(await whoIsIt()).toMatchObject({
		status: 200,
		body: { person: { name: 'Erna', email: 'Erna@example.org' } }
	});

	await page.goto(`${server.url}/account`);
	await expect(page.getByText('Erna@example.org')).toBeVisible();
	await page.getByRole('link', { name: 'Sign out' }).click();
	await page.getByRole('button', { name: 'Sign out' }).click();
	await page.waitForURL('**/sign-in');
	// An answer, not a refusal: the browser would report that as an error of the page.
	expect(await whoIsIt()).toEqual({ status: 200, body: { person: null } });

	// A page that needs somebody leads through the sign-in page and back.
	await page.goto(`${server.url}/account`);
	await page.waitForURL('**/sign-in?next=%2Faccount');
	await fillIn(page, { 'E-mail address': 'erna@EXAMPLE.org', Password: PASSWORD });
	await page.getByRole('button', { name: 'Sign in' }).click();
	await expect(page.getByRole('heading', { name: 'Account' })).toBeVisible();
});

test('without JavaScript the forms work and keep what was typed', async ({ browser, server }) => {
	const context = await browser.newContext({ javaScriptEnabled: false });
	const page = await context.newPage();
	await page.goto(`${server.url}/register`);
	await fillIn(page, { 'Your name': 'Erna', 'E-mail address': 'erna', Password: PASSWORD });
	await page.getByRole('button', { name: 'Register' }).click();
	await expect(page.getByText('This is not an e-mail address')).toBeVisible();
	await expect(emailField(page)).toHaveValue('erna');
	await expect(page.getByRole('textbox', { name: 'Password' })).toHaveValue('');
	await fillIn(page, { 'E-mail address': 'erna@example.org', Password: PASSWORD });
	await page.getByRole('button', { name: 'Register' }).click();
	await page.waitForURL('**/builds');
	await page.goto(`${server.url}/sign-out`);
	await page.getByRole('button', { name: 'Sign out' }).click();
	await page.waitForURL('**/sign-in');
	await page.goto(`${server.url}/account`);
	await page.waitForURL('**/sign-in?next=%2Faccount');
	await context.close();
});

test('with the server gone, a form says so and keeps everything that was typed', async ({
	page,
	server
}) => {
	await page.goto(`${server.url}/sign-in`);
	await fillIn(page, { 'E-mail address': 'erna@example.org', Password: PASSWORD });
	await server.stop();
	await page.getByRole('button', { name: 'Sign in' }).click();
	await expect(page.getByRole('alert')).toContainText('There is no answer from the server');
	await expect(emailField(page)).toHaveValue('erna@example.org');
	await expect(page.getByRole('textbox', { name: 'Password' })).toHaveValue(PASSWORD);
});

test('a wrong password and an address without account get the same answer', async ({ server }) => {
	await Caller.registered(server);
	const answerTo = async (email: string, headers: Fields) => {
		const answer = await new Caller(server).post('/sign-in', { email, password: 'wrong' }, headers);
		const kept = [...answer.headers].filter(
			([name]) => !['date', 'x-request-id', 'content-security-policy', 'etag'].includes(name)
		);
		const body = (await answer.text())
			.replaceAll(email, 'EMAIL')
			.replaceAll(/nonce="[^"]+"/g, 'nonce');
		return { status: answer.status, kept, body };
	};
	// As a browser sends it without and with JavaScript.
	for (const headers of [
		{},
		{ accept: 'application/json', 'x-sveltekit-action': 'true' }
	] as Fields[]) {
		const known = await answerTo('erna@example.org', headers);
		expect(known.body).toContain('do not go together');
		expect(await answerTo('nema@example.org', headers)).toEqual(known);
	}
});

const UNSAFE: [path: string, fields: Fields][] = [
	['/sign-in', { email: 'erna@example.org', password: PASSWORD }],
	['/register', { email: 'new@example.org', name: 'New', password: PASSWORD }],
	['/sign-out', {}],
	['/account?/password', { current: PASSWORD, password: NEW }]
];

for (const [path, fields] of UNSAFE) {
	test(`${path} takes nothing from another page, whatever its content type`, async ({ server }) => {
		const caller = await Caller.registered(server);
		const before = dump(server);
		const form = new URLSearchParams(fields).toString();
		const multipart = new FormData();
		for (const [name, value] of Object.entries(fields)) multipart.set(name, value);
		const urlencoded = 'application/x-www-form-urlencoded';
		const bytes = (text: string) => new TextEncoder().encode(text);
		const bodies: [what: string, body: BodyInit | null, type?: string][] = [
			['urlencoded', form, urlencoded],
			['multipart', multipart],
			['text/plain', JSON.stringify(fields), 'text/plain'],
			['text/plain in capitals', JSON.stringify(fields), 'Text/PLAIN; charset=x'],
			['no content type', bytes(form)],
			['no body', null],
			['JSON', JSON.stringify(fields), 'application/json']
		];
		const elsewhere: [what: string, headers: Fields][] = [
			['another site', { origin: EVIL }],
			['another port', { origin: 'http://localhost:1', 'sec-fetch-site': 'same-site' }],
			['a sandboxed frame', { origin: 'null' }],
			['who does not say', {}],
			['another scheme', { origin: server.url.replace('http:', 'https:') }]
		];
		for (const [what, body, type] of bodies) {
			for (const [from, headers] of elsewhere) {
				for (const method of ['POST', 'PUT', 'PATCH', 'DELETE']) {
					const sent = type === undefined ? headers : { ...headers, 'content-type': type };
					const answer = await caller.send(path, { method, body, headers: sent });
					expect(answer.status, `${method} ${what} from ${from}`).toBe(403);
					expect(answer.headers.getSetCookie(), `${what} from ${from}`).toEqual([]);
				}
			}
		}
		for (const method of ['GET', 'HEAD', 'OPTIONS']) {
			const query = path.includes('?') ? '&' : '?';
			const asked = `${path}${query}_method=POST&${form}`;
			const answer = await caller.send(asked, { method, headers: { origin: EVIL } });
			expect(answer.headers.get('access-control-allow-origin')).toBeNull();
		}
		expect(dump(server)).toEqual(before);
		expect(await caller.person()).toBeDefined();

		// The same form from our own page is taken, so the refusals above are no accident.
		const taken = await caller.post(path, fields);
		expect(taken.status).toBeLessThan(400);
		expect(dump(server)).not.toEqual(before);
	});
}

test('a page on another port of this machine, which shares the cookie, cannot sign anybody out', async ({
	page,
	server
}) => {
	const caller = await Caller.registered(server);
	const [name = '', value = ''] = caller.cookie.split('=');
	await page.context().addCookies([{ name, value, url: server.url, sameSite: 'Lax' }]);
	const attacker = createServer((_, response) => {
		response.setHeader('Content-Type', 'text/html').end('<title>elsewhere</title>');
	});
	await new Promise<void>((ready) => attacker.listen(0, '127.0.0.1', ready));
	try {
		await page.goto(`http://localhost:${(attacker.address() as AddressInfo).port}/`);
		for (const type of ['', 'text/plain']) {
			await page.evaluate(
				([url, contentType]) =>
					fetch(`${url}/sign-out`, {
						method: 'POST',
						mode: 'no-cors',
						credentials: 'include',
						body: new Blob(['{}'], { type: contentType })
					}).catch(() => undefined),
				[server.url, type] as const
			);
		}
		await expect
			.poll(() => server.log.filter((line) => line.msg === 'request from another origin').length)
			.toBeGreaterThan(0);
		expect(await caller.person()).toMatchObject({ name: 'erna' });
		// Signing somebody in under a stranger's name is refused like the rest, and plants no cookie.
		await page.evaluate((url) => {
			document.body.innerHTML = `<form method="post" action="${url}/sign-in">
				<input name="email" value="erna@example.org"><input name="password" value="longeron flap gusset">
			</form>`;
			document.forms[0]?.submit();
		}, server.url);
		await page.waitForURL(`${server.url}/sign-in`);
		const [kept] = await page.context().cookies(server.url);
		expect(kept?.value).toBe(value);
	} finally {
		attacker.close();
	}
});

test('under /api somebody who is signed out gets 401 as JSON, and a wrong address 404', async ({
	server
}) => {
	const nobody = new Caller(server);
	const stranger = new Caller(server);
	stranger.cookie = `tallybar=${'A'.repeat(43)}`;
	for (const caller of [nobody, stranger]) {
		const asked = await caller.send('/api/session');
		expect(await asked.json()).toEqual({ person: null });
		const answer = await caller.send('/api/builds');
		expect(answer.status).toBe(401);
		expect(answer.headers.get('content-type')).toContain('application/json');
		expect(answer.headers.get('cache-control')).toBe('no-store');
		expect(await answer.json()).toEqual({
			code: 'session.none',
			says: expect.stringContaining('Sign in again'),
			requestId: answer.headers.get('x-request-id')
		});
	}
	const nowhere = await nobody.send('/api/no/such/thing');
	expect(nowhere.status).toBe(404);
	expect(await nowhere.json()).toMatchObject({ code: 'request.no_such_page' });
	const erna = await Caller.registered(server);
	const put = await erna.send('/api/session', { method: 'PUT', headers: { origin: server.url } });
	expect(put.status).toBe(405);
	expect(put.headers.get('allow')).toContain('GET');
	expect(await put.json()).toMatchObject({ code: 'request.no_such_page' });
});

test('a request in the name of somebody else than the session is refused with 409', async ({
	server
}) => {
	const erna = await Caller.registered(server, 'erna');
	const otto = await Caller.registered(server, 'otto');
	const [ernaId, ottoId] = [(await erna.person())?.id ?? '', (await otto.person())?.id ?? ''];
	const asks = (person: string) =>
		erna.send('/api/session', { headers: { 'x-tallybar-person': person } });
	expect((await asks(ernaId)).status).toBe(200);
	for (const other of [ottoId, 'nonsense', '']) {
		const answer = await asks(other);
		expect(answer.status).toBe(409);
		expect(await answer.json()).toMatchObject({ code: 'session.other_person' });
	}

	// The log is never read or written without naming the person.
	for (const [path, headers, status] of [
		['/api/builds', { 'x-tallybar-person': ernaId }, 200],
		['/api/builds', { 'x-tallybar-person': ottoId }, 409],
		['/api/builds', {}, 400],
		[`/api/live?person=${ottoId}`, {}, 409],
		['/api/live', { 'x-tallybar-person': ernaId }, 400]
	] as [string, Fields, number][]) {
		expect((await erna.send(path, { headers })).status, path).toBe(status);
	}
});

test('while the database cannot be written a page says so under an id, and nothing else', async ({
	server
}) => {
	const erna = await Caller.registered(server);
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'));
	db.exec('begin immediate');
	try {
		const form = { email: 'erna@example.org', password: PASSWORD };
		const answer = await new Caller(server).post('/sign-in', form);
		expect(answer.status).toBe(500);
		const body = await answer.text();
		expect(body).toContain(answer.headers.get('x-request-id') ?? 'no id');
		expect(body).not.toMatch(/SQLITE|sqlite|at async|\.js:\d/);
		expect(await erna.person()).toMatchObject({ name: 'erna' });
	} finally {
		db.close();
	}
	const after = await erna.post('/sign-in', { email: 'erna@example.org', password: PASSWORD });
	expect(after.status).toBe(303);
});

test('guessing ends with 429 and the time to wait, for known and unknown accounts alike', async ({
	server
}) => {
	const erna = await Caller.registered(server);
	const tryOnce = async (email: string, password: string, number: number) => {
		const headers = { 'x-forwarded-for': `10.0.0.${number}` };
		const answer = await new Caller(server).post('/sign-in', { email, password }, headers);
		return { status: answer.status, wait: Number(answer.headers.get('retry-after')) };
	};
	for (const email of ['erna@example.org', 'nobody@example.org']) {
		const tries = await Promise.all(
			Array.from({ length: 20 }, (_, number) => tryOnce(email, 'wrong', number))
		);
		expect(tries.filter(({ status }) => status === 400)).toHaveLength(10);
		const refused = tries.filter(({ status }) => status === 429);
		expect(refused).toHaveLength(10);
		for (const { wait } of refused) {
			expect(wait).toBeGreaterThan(0);
			expect(wait).toBeLessThanOrEqual(900);
		}
	}
	await server.restart();
	expect((await tryOnce('erna@example.org', PASSWORD, 0)).status).toBe(429);
	expect(await erna.person()).toMatchObject({ name: 'erna' });
	// One password over many accounts: what is left of the fifty tries of this address.
	const spray = [];
	for (let i = 0; i < 32; i++) spray.push(await tryOnce(`person${i}@example.org`, 'wrong', i));
	expect(spray.filter(({ status }) => status === 400)).toHaveLength(30);
	expect(spray.at(-1)?.status).toBe(429);
});

test('changing the password signs out every other browser and keeps this one', async ({
	page,
	server
}) => {
	const other = await Caller.registered(server);
	await page.goto(`${server.url}/sign-in?next=/account`);
	await fillIn(page, { 'E-mail address': 'erna@example.org', Password: PASSWORD });
	await page.getByRole('button', { name: 'Sign in' }).click();
	await expect(page.getByRole('heading', { name: 'Account' })).toBeVisible();
	const [before] = await page.context().cookies();

	await fillIn(page, { 'Present password': 'not the present one', 'New password': NEW });
	await page.getByRole('button', { name: 'Change the password' }).click();
	await expect(page.getByText('The present password is not right')).toBeVisible();
	expect(await other.person()).toBeDefined();

	await fillIn(page, { 'Present password': PASSWORD, 'New password': NEW });
	await page.getByRole('button', { name: 'Change the password' }).click();
	await expect(page.getByRole('status').filter({ hasText: 'was changed' })).toBeVisible();
	expect(await other.person()).toBeUndefined();
	const [after] = await page.context().cookies();
	expect(after?.value).not.toBe(before?.value);
	await page.reload();
	await expect(page.getByRole('heading', { name: 'Account' })).toBeVisible();

	const again = new Caller(server);
	const old = await again.post('/sign-in', { email: 'erna@example.org', password: PASSWORD });
	expect(old.status).toBe(400);
	const fresh = await again.post('/sign-in', { email: 'erna@example.org', password: NEW });
	expect(fresh.status).toBe(303);
});

test('signing in gives a new cookie and ends the one sent along; signing out ends it too', async ({
	server
}) => {
	const caller = await Caller.registered(server);
	const first = caller.cookie;
	const signIn = () => caller.post('/sign-in', { email: 'erna@example.org', password: PASSWORD });
	await signIn();
	const second = caller.cookie;
	expect(second).not.toBe(first);
	caller.cookie = first;
	expect(await caller.person()).toBeUndefined();

	const planted = `tallybar=${'A'.repeat(43)}`;
	caller.cookie = planted;
	await signIn();
	expect(caller.cookie).not.toBe(planted);

	caller.cookie = second;
	await caller.post('/sign-out', {});
	caller.cookie = second;
	expect(await caller.person()).toBeUndefined();
	const page = await caller.send('/account');
	expect(page.status).toBe(303);
	const data = await caller.send('/account/__data.json');
	expect(await data.json()).toMatchObject({
		type: 'redirect',
		location: '/sign-in?next=%2Faccount'
	});
});

test('the token stands in the cookie only: not on the disk, in the log, in a page or an answer', async ({
	server
}) => {
	const caller = await Caller.registered(server);
	const token = caller.cookie.split('=')[1] ?? '';
	expect(token).toMatch(/^[A-Za-z0-9_-]{43}$/);
	const pages = await Promise.all(
		['/account', '/api/session', '/sign-in', '/account/__data.json'].map(async (path) => {
			const answer = await caller.send(path);
			expect(answer.headers.get('cache-control'), path).toBe('no-store');
			return answer.text();
		})
	);
	expect(pages.join()).toContain('erna@example.org');
	const disk = readdirSync(server.dataDir).map((name) =>
		readFileSync(join(server.dataDir, name), 'latin1')
	);
	await server.restart();
	const log = JSON.stringify(server.log);
	expect(log).toContain('registered');
	for (const secret of [token, PASSWORD]) {
		for (const place of [...pages, ...disk, log]) expect(place.includes(secret)).toBe(false);
	}
});

test('over https the cookie is bound to this very host', async () => {
	const origin = 'https://log.example.org';
	const server = await TestServer.start({ ORIGIN: origin });
	try {
		const caller = new Caller(server, origin);
		const answer = await caller.post('/register', {
			email: 'erna@example.org',
			name: 'Erna',
			password: PASSWORD
		});
		expect(answer.status).toBe(303);
		const [set = ''] = answer.headers.getSetCookie();
		expect(set).toMatch(/^__Host-tallybar=[A-Za-z0-9_-]{43};/);
		const parts = set.toLowerCase().split('; ').slice(1);
		expect(parts).toEqual(expect.arrayContaining(['path=/', 'httponly', 'secure', 'samesite=lax']));
		expect(set.toLowerCase()).not.toContain('domain');
		expect(await caller.person()).toMatchObject({ name: 'Erna' });
	} finally {
		await server.dispose();
	}
});
