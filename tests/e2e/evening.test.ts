import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { chromium, type BrowserContext, type Page } from '@playwright/test';
import Sqlite from 'better-sqlite3';
import { Caller, PASSWORD } from '../support/caller';
import { makeDevice, makeId, openBuild, sealedPush, writeLine } from '../support/people';
import { expect, test, type TestServer } from './server';

const HOLES = 64;

/** Ana's build with one seam, and Jo at home who may look on. */
async function crew(server: TestServer) {
	const [ana, jo] = [await Caller.registered(server, 'ana'), await Caller.registered(server, 'jo')];
	const person = (await ana.person())?.id ?? '';
	const device = await makeDevice(person);
	const { build, opened, enrolled } = openBuild(device, 'Yarrow Two');
	const [assembly, seam] = [makeId(), makeId()];
	const plan = { name: 'Skin to spar, lower', assembly, holes: { count: HOLES, first: 1 } };
	const lines = [
		writeLine(
			device,
			build,
			'assembly.planned',
			{ name: 'Left elevator' },
			{ id: assembly, assembly }
		),
		writeLine(device, build, 'seam.planned', plan, { id: seam, seam })
	];
	await ana.push(person, build, await sealedPush(device, build, [opened, enrolled, ...lines]));
	const email = (await jo.person())?.email;
	await ana.api(person, `builds/${build}/crew`, { email, role: 'follower' });
	return { build, seam };
}

async function signIn(page: Page, server: TestServer, name: string): Promise<void> {
	await page.goto(`${server.url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill(`${name}@example.org`);
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
}

/** The texts of all lines about a seam, as they lie in the store of the page. */
function textsOnDevice(page: Page, seam: string): Promise<string[]> {
	return page.evaluate(async (part) => {
		const all = await indexedDB.databases();
		const name = all
			.map((found) => found.name ?? '')
			.find((found) => found.startsWith('tallybar.'));
		const db = await new Promise<IDBDatabase>((resolve, reject) => {
			const request = indexedDB.open(name ?? '');
			request.onsuccess = () => {
				resolve(request.result);
			};
			request.onerror = () => {
				reject(new Error(String(request.error)));
			};
		});
		const rows = await new Promise<{ part: string; text: string }[]>((resolve) => {
			const request = db.transaction('entries').objectStore('entries').getAll();
			request.onsuccess = () => {
				resolve(request.result as { part: string; text: string }[]);
			};
		});
		db.close();
		return rows
			.filter((row) => row.part === part)
			.map((row) => row.text)
			.sort();
	}, seam);
}

function textsOnServer(server: TestServer, seam: string): string[] {
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'), { readonly: true });
	try {
		const rows = db.prepare('select text from entry where seam = ?').all(seam) as {
			text: string;
		}[];
		return rows.map(({ text }) => text).sort();
	} finally {
		db.close();
	}
}

const driven = (page: Page) => page.getByRole('button', { name: /^driven \+\d/i });
const count = (page: Page, holes: number) =>
	expect(page.getByText(`${holes} of ${HOLES} driven`).first()).toBeVisible();

test('an evening with no network: logged, the browser closed, found again offline, merged, seen at home', async ({
	server,
	browser
}) => {
	test.setTimeout(120_000);
	const { build, seam } = await crew(server);

	// Jo at home leaves the wall open.
	const home = await browser.newContext({ viewport: { width: 1280, height: 800 } });
	const wall = await home.newPage();
	await signIn(wall, server, 'jo');
	await wall.goto(`${server.url}/builds/${build}/wall`);
	await expect(wall.getByText(`of ${HOLES} holes driven`).first()).toBeVisible();

	// Ana in the hangar; a browser with a profile on disk, which can be closed and opened again.
	const profile = mkdtempSync(join(tmpdir(), 'tallybar-hangar-'));
	const { launchOptions } = test.info().project.use;
	const open = (): Promise<BrowserContext> =>
		chromium.launchPersistentContext(profile, {
			...launchOptions,
			viewport: { width: 412, height: 823 }
		});
	let phone = await open();
	let bench = await phone.newPage();
	await signIn(bench, server, 'ana');
	await bench.goto(`${server.url}/builds/${build}/bench/${seam}`);
	await count(bench, 0);
	await phone.setOffline(true);
	await server.kill();

	await bench.clock.install();
	await bench.getByRole('button', { name: '10', exact: true }).click();
	for (let holes = 10; holes <= 60; holes += 10) {
		await driven(bench).click();
		await count(bench, holes);
		// The next press is another one only after a second.
		await bench.clock.fastForward(1100);
	}
	await bench.getByRole('button', { name: 'DEFECT' }).click();
	await bench.getByRole('checkbox', { name: /^hole 60:/ }).check();
	await bench.getByRole('radio', { name: 'tipped' }).check();
	await bench.getByRole('button', { name: 'Note the defect' }).click();
	await expect(bench.getByRole('dialog')).toBeHidden();
	await bench.clock.fastForward(1100);
	await bench.getByRole('button', { name: 'left open' }).click();
	for (const hole of [61, 62])
		await bench.getByRole('checkbox', { name: new RegExp(`^hole ${hole}:`) }).check();
	await bench.getByRole('radio', { name: 'the bar does not go in' }).check();
	await bench.getByRole('radio', { name: 'a pulled rivet' }).check();
	await bench.getByRole('button', { name: 'Leave open' }).click();
	await expect(bench.getByRole('dialog')).toBeHidden();
	await phone.close();

	// Later: still no network, no server, a new browser, straight to the address.
	phone = await open();
	await phone.setOffline(true);
	bench = await phone.newPage();
	await bench.goto(`${server.url}/builds/${build}/bench/${seam}`);
	await count(bench, 60);
	await expect(bench.getByText('2 left open · 1 with a defect')).toBeVisible();
	const logged = await textsOnDevice(bench, seam);
	expect(logged).toHaveLength(1 + 6 + 1 + 1);

	// At home: the server is back, the phone has a network.
	await server.start();
	await phone.setOffline(false);
	await expect
		.poll(() => textsOnServer(server, seam), { timeout: 30_000, intervals: [50] })
		.toEqual(logged);
	const arrived = Date.now();
	await expect(wall.getByText('60', { exact: true }).first()).toBeVisible({ timeout: 30_000 });
	await expect(wall.getByText('2 left open · 1 with a defect')).toBeVisible();
	// Printed, not asserted: the machine is noisy. The goal is 2 s.
	console.log(`on the wall ${Date.now() - arrived} ms after the server had it (goal 2000 ms)`);
	await expect(bench.getByText(/^synced/).first()).toBeVisible({ timeout: 30_000 });

	await phone.close();
	await home.close();
	rmSync(profile, { recursive: true, force: true });
});
