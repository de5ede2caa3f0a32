import { join } from 'node:path';
import type { Page } from '@playwright/test';
import Sqlite from 'better-sqlite3';
import { Caller, PASSWORD } from '../support/caller';
import { makeDevice, openBuild, planSeam, sealedPush } from '../support/people';
import { expect, test, type TestServer } from './server';

// Each starts a server and a browser that installs the app.
test.describe.configure({ timeout: 120_000 });
test.use({ viewport: { width: 412, height: 823 } });

async function atTheBench(page: Page, server: TestServer) {
	const caller = await Caller.registered(server, 'ana');
	const person = (await caller.person())?.id ?? '';
	const device = await makeDevice(person);
	const { build, opened, enrolled } = openBuild(device, 'Yarrow Two');
	const { seam, lines } = planSeam(device, build, 60);
	await caller.push(person, build, await sealedPush(device, build, [opened, enrolled, ...lines]));
	await page.goto(`${server.url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill('ana@example.org');
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
	await page.goto(`${server.url}/builds/${build}/bench/${seam}`);
	await expect(page.getByText('0 of 60 driven').first()).toBeVisible();
	return { build, seam };
}

function drivenOn(server: TestServer, seam: string): number {
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'), { readonly: true });
	try {
		const rows = db.prepare(`select id from entry where seam = ? and kind = 'holes.driven'`);
		return rows.all(seam).length;
	} finally {
		db.close();
	}
}

test('what was saved at the bench goes out from a page of the server too', async ({
	page,
	server
}) => {
	const { build, seam } = await atTheBench(page, server);
	await server.stop();
	await page.getByRole('button', { name: /^driven \+5/i }).click();
	await expect(page.getByText('5 of 60 driven').first()).toBeVisible();
	await server.start();
	await page.goto(`${server.url}/account`);
	await expect.poll(() => drivenOn(server, seam), { timeout: 30_000 }).toBe(1);

	// Without leaving the app: from the log to the crew, the sync goes on.
	await page.goto(`${server.url}/builds/${build}/wall`);
	const streams = () =>
		page.evaluate(() =>
			performance.getEntriesByType('resource').map(({ name }) => new URL(name).pathname)
		);
	await page.getByRole('link', { name: 'Crew' }).click();
	await expect(page.getByRole('heading', { name: 'Crew' })).toBeVisible();
	const asked = (paths: string[]) => paths.filter((path) => path === '/api/builds').length;
	const before = asked(await streams());
	await page.evaluate(() => window.dispatchEvent(new Event('online')));
	await expect
		.poll(async () => asked(await streams()), { timeout: 10_000 })
		.toBeGreaterThan(before);
});

test('signing in and registering come without the code of the device', async ({
	browser,
	server
}) => {
	const context = await browser.newContext({ serviceWorkers: 'block' });
	const page = await context.newPage();
	const scripts: Promise<string>[] = [];
	page.on('response', (answer) => {
		if (answer.url().endsWith('.js')) scripts.push(answer.text());
	});
	const deviceCode = async () =>
		(await Promise.all(scripts)).some((text) => text.includes('device.enrolled'));
	for (const path of ['/sign-in', '/register']) {
		await page.goto(server.url + path, { waitUntil: 'networkidle' });
		expect(scripts.length).toBeGreaterThan(0);
		expect(await deviceCode(), path).toBe(false);
	}
	await page.goto(`${server.url}/builds`, { waitUntil: 'networkidle' });
	expect(await deviceCode()).toBe(true);
	await context.close();
});

test('with the server dead, its pages say what is safe and lead back', async ({ page, server }) => {
	const { build } = await atTheBench(page, server);
	await page.goto(`${server.url}/builds/${build}/wall`);
	await server.kill();
	for (const [path, title] of [
		[`/builds/${build}/crew`, 'Crew'],
		['/account', 'Account'],
		['/sign-in', 'Sign in']
	] as const) {
		await page.goto(server.url + path);
		await expect(page.getByRole('heading', { name: title })).toBeVisible();
		await expect(page.getByText('there is no answer from it')).toBeVisible();
		await expect(page.getByText('What you logged is kept on this device')).toBeVisible();
	}
	await page.goto(`${server.url}/builds/${build}/crew`);
	await page.getByRole('link', { name: 'Back to the build' }).click();
	await expect(page.getByText('of 60 holes driven')).toBeVisible();
	await page.goto(`${server.url}/account`);
	await server.start();
	await page.getByRole('button', { name: 'Try again' }).click();
	await expect(page.getByText('ana@example.org')).toBeVisible();
});
