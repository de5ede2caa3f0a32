import { join } from 'node:path';
import type { Page } from '@playwright/test';
import Sqlite from 'better-sqlite3';
import { Caller, PASSWORD } from '../support/caller';
import { driveHoles, enrol, makeDevice, openBuild, sealedPush, writeLine } from '../support/people';
import { makeId } from '../support/people';
import { expect, test, type TestServer } from './server';

/** A build with one seam of 24 holes, planned from another device of the same person and known to the server. */
async function plannedSeam(server: TestServer, name = 'ana') {
	const caller = await Caller.registered(server, name);
	const person = (await caller.person())?.id ?? '';
	const device = await makeDevice(person);
	const { build, opened, enrolled } = openBuild(device, 'Yarrow Two');
	const [assembly, seam] = [makeId(), makeId()];
	const lines = [
		opened,
		enrolled,
		writeLine(
			device,
			build,
			'assembly.planned',
			{ name: 'Left elevator' },
			{ id: assembly, assembly }
		),
		writeLine(
			device,
			build,
			'seam.planned',
			{
				name: 'Skin to spar, lower',
				assembly,
				holes: { count: 24, first: 1 },
				callout: 'MS20426AD3-3.5',
				endOne: 'inboard',
				endLast: 'tip'
			},
			{ id: seam, seam }
		)
	];
	await caller.push(person, build, await sealedPush(device, build, lines));
	return { caller, person, device, build, assembly, seam };
}

async function signIn(page: Page, server: TestServer, name = 'ana'): Promise<void> {
	await page.goto(`${server.url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill(`${name}@example.org`);
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
}

/** The bench of the seam, with everything the app needs offline on the device. */
async function openBench(page: Page, server: TestServer, build: string, seam: string) {
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
	await page.goto(`${server.url}/builds/${build}/bench/${seam}`);
	await expect(page.getByRole('heading', { name: 'Skin to spar, lower' })).toBeVisible();
}

const driven = (page: Page) => page.getByRole('button', { name: /^driven \+\d/i });
const count = (page: Page, holes: number) =>
	expect(page.getByText(`${holes} of 24 driven`).first()).toBeVisible();

test.use({ viewport: { width: 412, height: 823 } });
// Each starts a server and a browser that installs the app.
test.describe.configure({ timeout: 120_000 });

test('twelve holes in runs, undo, a defect, one left open; then the server dies and all of it is still there', async ({
	page,
	context,
	server
}) => {
	const { build, seam } = await plannedSeam(server);
	await signIn(page, server);
	await openBench(page, server, build, seam);
	await page.clock.install();
	await server.stop();

	const press = async (holes: number) => {
		await driven(page).click();
		await count(page, holes);
		// The next press is another one only after a second.
		await page.clock.fastForward(1100);
	};
	await expect(driven(page)).toHaveText(/driven\s*\+5/i);
	await press(5);
	await press(10);
	await page.getByRole('button', { name: '2', exact: true }).click();
	await press(12);
	await expect(page.getByText('next', { exact: true }).locator('..')).toContainText('13–14');

	await page.getByRole('button', { name: 'undo 11–12' }).click();
	await count(page, 10);
	await page.clock.fastForward(1100);
	await press(12);

	await page.getByRole('button', { name: 'DEFECT', exact: true }).click();
	await page.getByRole('checkbox', { name: /^hole 12:/ }).check();
	await page.getByRole('radio', { name: 'tipped' }).check();
	await page.getByRole('button', { name: 'Note the defect' }).click();
	await expect(page.getByRole('dialog')).toBeHidden();
	await expect(
		page.getByRole('button', { name: /^hole 12: driven, defect: tipped/ })
	).toBeVisible();
	await page.clock.fastForward(1100);

	await page.getByRole('button', { name: 'left open', exact: true }).click();
	await page.getByRole('checkbox', { name: /^hole 13:/ }).check();
	await page.getByRole('radio', { name: 'the bar does not go in' }).check();
	await page.getByRole('radio', { name: 'a pulled rivet' }).check();
	await page.getByRole('button', { name: 'Leave open' }).click();
	await expect(page.getByRole('dialog')).toBeHidden();
	await expect(page.getByText('next', { exact: true }).locator('..')).toContainText('14–15');
	await page.close();

	// A new tab, by address, with nothing but the device.
	const later = await context.newPage();
	await later.goto(`${server.url}/builds/${build}/bench/${seam}`);
	await count(later, 12);
	await expect(later.getByText('1 left open · 1 with a defect')).toBeVisible();
	await expect(later.getByText(/^\d+ waiting$/)).toBeVisible();
	// The run length was remembered.
	await expect(later.getByRole('button', { name: '2', exact: true })).toHaveAttribute(
		'aria-pressed',
		'true'
	);

	await later.goto(`${server.url}/builds/${build}/logbook?seam=${seam}`);
	await expect(later.getByText('left open 13 · the bar does not go in')).toBeVisible();
	await expect(later.getByText('defect 12: tipped')).toBeVisible();
	await expect(later.getByText(/struck by .*, undo/)).toBeVisible();

	await later.getByRole('link', { name: /^Sync: waiting/ }).click();
	await expect(later.getByText(/^\d+ lines are only on this phone\.$/)).toBeVisible();
	await server.start();
	await later.getByRole('button', { name: 'Try now' }).click();
	await expect(later.getByRole('link', { name: /^Sync: synced/ })).toBeVisible();
	expect(serverHas(server, build, 'holes.driven')).toBe(4);
});

/** Lines of a kind in the server's log. */
function serverHas(server: TestServer, build: string, kind: string): number {
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'), { readonly: true });
	try {
		const rows = db.prepare('select text from entry where build = ?').all(build) as {
			text: string;
		}[];
		return rows.filter(({ text }) => (JSON.parse(text) as { kind: string }).kind === kind).length;
	} finally {
		db.close();
	}
}

test('a double press logs one run, and a held key does not go on logging', async ({
	page,
	server
}) => {
	const { build, seam } = await plannedSeam(server);
	await signIn(page, server);
	await openBench(page, server, build, seam);
	await page.clock.install();
	await driven(page).dblclick();
	await count(page, 5);
	await expect(page.getByRole('button', { name: 'undo 1–5' })).toBeEnabled();

	// As a bouncing pedal does it: pressed again and again within a second of the first.
	await page.clock.fastForward(2000);
	await driven(page).evaluate(async (key: HTMLElement) => {
		key.click();
		const begun = performance.now();
		while (performance.now() - begun < 800) {
			await new Promise((resolve) => setTimeout(resolve, 40));
			if (performance.now() - begun < 800) key.click();
		}
	});
	await count(page, 10);
	await expect(page.getByRole('button', { name: 'undo 6–10' })).toBeEnabled();

	// A key held down repeats; only its first press counts.
	await driven(page).focus();
	await page.clock.fastForward(2000);
	await page.keyboard.down('Enter');
	await page.clock.fastForward(2000);
	await page.keyboard.down('Enter');
	await page.clock.fastForward(2000);
	await page.keyboard.down('Enter');
	await page.keyboard.up('Enter');
	await count(page, 15);
	await expect(page.getByRole('button', { name: 'undo 11–15' })).toBeEnabled();
});

test('a replaced rivet is drilled out, driven and fixed in one act, and undone in one', async ({
	page,
	server
}) => {
	const { build, seam, caller, person, device } = await plannedSeam(server);
	const run = driveHoles(device, build, seam, 1, 6);
	const defect = writeLine(
		device,
		build,
		'defect.noted',
		{ holes: [{ from: 3, to: 3 }], fault: 'smile' },
		{ seam, on: [run.id] }
	);
	await caller.push(person, build, await sealedPush(device, build, [run, defect]));
	await signIn(page, server);
	await openBench(page, server, build, seam);
	await count(page, 6);

	await page.getByRole('button', { name: 'DEFECT', exact: true }).click();
	await page.getByRole('button', { name: '3 · smile ›' }).click();
	await page.getByRole('radio', { name: /^replaced drilled out/ }).check();
	await page.getByRole('button', { name: 'Write it down' }).click();
	await expect(page.getByRole('button', { name: 'hole 3: driven, replaced' })).toBeVisible();
	await count(page, 6);

	await page.getByRole('button', { name: 'undo fix 3' }).click();
	await expect(page.getByRole('button', { name: /^hole 3: driven, defect: smile/ })).toBeVisible();
});

test('what was logged twice is settled at the bench', async ({ page, server }) => {
	const { build, seam, caller, person, device } = await plannedSeam(server);
	const other = await makeDevice(person);
	other.n = 10;
	const lines = [driveHoles(device, build, seam, 1, 5), enrol(other, build)];
	await caller.push(person, build, await sealedPush(device, build, lines.slice(0, 1)));
	const twice = [lines[1], driveHoles(other, build, seam, 4, 5)].filter(
		(line) => line !== undefined
	);
	await caller.push(person, build, await sealedPush(other, build, twice));
	await signIn(page, server);
	await openBench(page, server, build, seam);
	await page.getByRole('button', { name: '1 to settle' }).click();
	await page.getByRole('button', { name: /^driven 1–5/ }).click();
	await expect(page.getByRole('button', { name: /to settle/ })).toBeHidden();
	await count(page, 5);
});

test('a seam nobody planned leads on instead of staying blank, and keys are large enough for gloves', async ({
	page,
	server
}) => {
	const { build, seam } = await plannedSeam(server);
	await signIn(page, server);
	await openBench(page, server, build, seam);
	expect(await tooSmall(page, 64)).toEqual([]);
	const [defect, drivenKey] = await Promise.all(
		[page.getByRole('button', { name: 'DEFECT', exact: true }), driven(page)].map((key) =>
			key.boundingBox()
		)
	);
	expect((drivenKey?.x ?? 0) - ((defect?.x ?? 0) + (defect?.width ?? 0))).toBeGreaterThanOrEqual(
		49
	);
	expect(drivenKey?.height).toBeGreaterThanOrEqual(140);

	await page.goto(`${server.url}/builds/${build}/bench/${makeId()}`);
	await expect(
		page.getByRole('heading', { name: 'This seam is not on this device' })
	).toBeVisible();
	await page.getByRole('link', { name: 'Choose a seam' }).click();
	await page.getByRole('searchbox').fill('spar 426ad3');
	await expect(page.getByRole('link', { name: /Skin to spar, lower/ })).toBeVisible();
	await page.getByRole('searchbox').fill('rudder');
	await expect(page.getByText('No seam is called that')).toBeVisible();
});

/** What can be touched and is smaller than so many CSS pixels either way. */
function tooSmall(page: Page, least: number): Promise<string[]> {
	return page.evaluate(
		(most) =>
			[...document.querySelectorAll<HTMLElement>('a, button, input, select, textarea')]
				.filter((element) => {
					const { width, height } = element.getBoundingClientRect();
					return width > 0 && height > 0 && Math.min(width, height) < most - 0.5;
				})
				.map(
					(element) => element.innerText || element.getAttribute('aria-label') || element.tagName
				),
		least
	);
}
