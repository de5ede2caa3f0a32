import type { Page } from '@playwright/test';
import { Caller, PASSWORD } from '../support/caller';
import { enrol, makeDevice, makeId, openBuild, sealedPush, writeLine } from '../support/people';
import type { LineParts, TestDevice } from '../support/people';
import type { Body, Kind } from '../../src/lib/logbook/kinds';
import { expect, test } from './server';
import type { TestServer } from './server';

// Two browsers and a server that dies: on a busy machine that is more than a minute.
test.slow();

async function register(page: Page, server: TestServer, name: string): Promise<void> {
	await page.goto(`${server.url}/register`);
	await page.getByRole('textbox', { name: 'Your name' }).fill(name);
	await page
		.getByRole('textbox', { name: 'E-mail address' })
		.fill(`${name.toLowerCase()}@example.org`);
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Register' }).click();
	await page.waitForURL('**/builds');
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
	await expect(page.getByRole('heading', { name: 'My builds' })).toBeVisible();
}

/** How many lines of their one build the server has. */
function headOf(page: Page): Promise<number | undefined> {
	return page.evaluate(async () => {
		const session = (await (await fetch('/api/session')).json()) as { person: { id: string } };
		const headers = { 'x-tallybar-person': session.person.id };
		const answer = await fetch('/api/builds', { headers });
		return ((await answer.json()) as { builds: { head: number }[] }).builds[0]?.head;
	});
}

test('with the server gone a build is opened and planned, and is there after a deep link', async ({
	page,
	context,
	server
}) => {
	await register(page, server, 'Ana');
	await server.kill();
	await page.goto(`${server.url}/builds`);

	// A name is asked for before anything is saved.
	await page.getByRole('button', { name: 'Open the build' }).click();
	await expect(page.getByText('Give it the name painted on it')).toBeVisible();
	await page.getByRole('textbox', { name: 'Name', exact: true }).fill('Yarrow Two');
	await page.getByRole('button', { name: 'Open the build' }).click();
	await page.waitForURL('**/plan');

	await page.getByRole('link', { name: 'Add the first assembly' }).click();
	await expect(page.getByRole('heading', { name: 'New assembly' })).toBeVisible();
	await page.getByRole('textbox', { name: 'Name' }).fill('Left elevator');
	await page.getByRole('button', { name: 'Plan this assembly' }).click();
	await expect(page.getByRole('heading', { name: 'New seam' })).toBeVisible();

	// What is wrong is said at its field, and what was typed stays, also over a reload.
	await page.getByRole('textbox', { name: 'Name' }).fill('Skin to spar, lower');
	await page.getByRole('combobox', { name: 'Rivet, as the plans call it' }).fill('MS20426AD3-3.5');
	await page.getByRole('textbox', { name: 'How many' }).fill('64');
	await page.getByRole('textbox', { name: 'Pitch' }).fill('3/7');
	await page.getByRole('button', { name: 'Plan this seam' }).click();
	await expect(page.getByRole('textbox', { name: 'Pitch' })).toBeFocused();
	await expect(page.getByText('“3/7” is a fraction over 7')).toBeVisible();
	await page.getByRole('textbox', { name: 'Pitch' }).fill('3/4');
	await page.getByRole('textbox', { name: 'Edge distance' }).fill('.25');
	await page.reload();
	await expect(page.getByRole('textbox', { name: 'Edge distance' })).toHaveValue('.25');
	await expect(page.getByRole('textbox', { name: 'Pitch' })).toHaveValue('3/4');
	await page.getByRole('button', { name: 'Plan this seam' }).click();
	await expect(page.getByText('Skin to spar, lower: 64 holes planned')).toBeVisible();

	// Changed: only what was changed, and the table follows.
	await page.getByRole('link', { name: 'Back to the plan' }).click();
	await page.getByRole('link', { name: 'Skin to spar, lower' }).click();
	const callout = page.getByRole('combobox', { name: 'Rivet, as the plans call it' });
	await expect(callout).toHaveValue('MS20426AD3-3.5');
	await callout.fill('MS20426AD3-4');
	await page.getByRole('button', { name: 'Save the change' }).click();
	await expect(page.getByText('Changed: Rivet. Saved on this device.')).toBeVisible();
	await expect(page.getByRole('row', { name: /Skin to spar, lower/ })).toContainText(
		'MS20426 AD 3-4'
	);

	// In a new tab, by an address never visited in it, with the server still dead.
	const later = await context.newPage();
	await later.goto(page.url());
	await expect(later.getByRole('combobox', { name: 'Rivet, as the plans call it' })).toHaveValue(
		'MS20426AD3-4'
	);
	await later.getByText('Add holes', { exact: true }).click();
	await later.getByRole('textbox', { name: 'How many' }).fill('2');
	await later.getByRole('button', { name: 'Add these holes' }).click();
	await expect(later.getByText('2 holes added')).toBeVisible();

	// The first tab hears of it, without a reload.
	await page.getByRole('link', { name: 'Wall' }).click();
	await expect(page.getByText('of 66 holes driven')).toBeVisible();
	await expect(page.getByText('seam planned: Skin to spar, lower')).toBeVisible();
	await expect(page.getByRole('article', { name: 'Left elevator' })).toContainText('0 of 66');

	// The address of the build alone leads to its wall.
	const wall = new URL(page.url());
	await later.goto(`${wall.origin}${wall.pathname.replace(/\/wall$/, '')}`);
	await expect(later.getByText('of 66 holes driven')).toBeVisible();

	// The server back, everything goes out.
	await server.start();
	await later.reload();
	await expect(later.getByRole('link', { name: /^Sync: synced/ })).toBeVisible({ timeout: 30_000 });
});

test('two people who changed one field apart see both values, and choosing settles it for both', async ({
	browser,
	server
}) => {
	const [ana, jo] = await Promise.all(
		['Ana', 'Jo'].map(async (name) => {
			const context = await browser.newContext();
			const page = await context.newPage();
			await register(page, server, name);
			return { context, page };
		})
	);
	if (!ana || !jo) throw new Error('two people are needed');

	await ana.page.getByRole('textbox', { name: 'Name', exact: true }).fill('Yarrow Two');
	await ana.page.getByRole('button', { name: 'Open the build' }).click();
	await ana.page.getByRole('link', { name: 'Add the first assembly' }).click();
	await expect(ana.page.getByRole('heading', { name: 'New assembly' })).toBeVisible();
	await ana.page.getByRole('textbox', { name: 'Name' }).fill('Rudder');
	await ana.page.getByRole('button', { name: 'Plan this assembly' }).click();
	await expect(ana.page.getByRole('heading', { name: 'New seam' })).toBeVisible();
	await ana.page.getByRole('textbox', { name: 'Name' }).fill('Skin to ribs');
	await ana.page.getByRole('textbox', { name: 'How many' }).fill('20');
	await ana.page.getByRole('button', { name: 'Plan this seam' }).click();
	await expect(ana.page.getByText('Skin to ribs: 20 holes planned')).toBeVisible();
	// Opened, two devices and the owner noted, the assembly, the seam: all with the server before this page is left.
	await expect.poll(() => headOf(ana.page), { timeout: 30_000 }).toBe(6);

	// The owner brings Jo in; Jo's phone hears of it by itself.
	await ana.page.getByRole('link', { name: 'Crew' }).click();
	await ana.page.getByRole('textbox', { name: 'E-mail address' }).fill('jo@example.org');
	await ana.page.getByRole('button', { name: 'Add to the crew' }).click();
	await expect(ana.page.getByText('Added to the crew.')).toBeVisible();
	await jo.page.reload();
	await jo.page.getByRole('link', { name: 'Yarrow Two' }).click();
	await expect(jo.page.getByText('of 20 holes driven')).toBeVisible();

	await ana.page.getByRole('link', { name: 'Yarrow Two' }).click();
	const apart = [
		{ ...ana, callout: 'MS20470AD4-5' },
		{ ...jo, callout: 'MS20470AD4-6' }
	];
	for (const { page } of apart) {
		await page.getByRole('link', { name: 'Plan', exact: true }).click();
		await page.getByRole('link', { name: 'Skin to ribs' }).click();
		await expect(page.getByRole('button', { name: 'Save the change' })).toBeVisible();
	}
	for (const { context } of apart) await context.setOffline(true);
	for (const { page, callout } of apart) {
		await page.getByRole('combobox', { name: 'Rivet, as the plans call it' }).fill(callout);
		await page.getByRole('button', { name: 'Save the change' }).click();
		await expect(page.getByText('Changed: Rivet. Saved on this device.')).toBeVisible();
	}
	for (const { context } of apart) await context.setOffline(false);

	for (const { page } of apart)
		await expect(page.getByText('2 values')).toBeVisible({ timeout: 20_000 });
	await jo.page.getByRole('button', { name: /^Keep this.*AD 4-5$/ }).click();
	for (const { page } of apart) {
		await expect(page.getByText('2 values')).toHaveCount(0, { timeout: 20_000 });
		await expect(page.getByRole('row', { name: /Skin to ribs/ })).toContainText('MS20470 AD 4-5');
	}
	await Promise.all([ana.context.close(), jo.context.close()]);
});

/** A build with one assembly and no seam, and somebody who writes lines about it from two devices elsewhere. */
async function plannedElsewhere(server: TestServer) {
	const caller = await Caller.registered(server, 'ana');
	const person = (await caller.person())?.id ?? '';
	const devices = [await makeDevice(person), await makeDevice(person)] as const;
	const [one, other] = devices;
	const { build, opened, enrolled } = openBuild(one, 'Yarrow Two');
	const assembly = makeId();
	const planned = writeLine(
		one,
		build,
		'assembly.planned',
		{ name: 'Left elevator' },
		{ id: assembly, assembly }
	);
	await caller.push(person, build, await sealedPush(one, build, [opened, enrolled, planned]));
	other.n = one.n;
	await caller.push(person, build, await sealedPush(other, build, [enrol(other, build)]));
	const write = async <K extends Kind>(
		device: TestDevice,
		kind: K,
		body: Body<K>,
		parts: LineParts
	) => {
		device.n += 20;
		const line = writeLine(device, build, kind, body, parts);
		const { results } = await caller.push(person, build, await sealedPush(device, build, [line]));
		if (results[0]?.status !== 'accepted') throw new Error(JSON.stringify(results));
		return line.id;
	};
	return { caller, devices, build, assembly, write };
}

async function signIn(page: Page, server: TestServer, name: string): Promise<void> {
	await page.goto(`${server.url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill(`${name}@example.org`);
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
}

test('an assembly is changed, settled, reopened, taken out and brought back; the build is described anew', async ({
	page,
	server
}) => {
	const { devices, build, assembly, write } = await plannedElsewhere(server);
	await signIn(page, server, 'ana');
	await page.goto(`${server.url}/builds/${build}/wall`);
	await expect(page.getByText('1 assembly, no seam yet')).toBeVisible();
	await expect(page.getByRole('link', { name: 'Plan a seam of Left elevator' })).toBeVisible();

	// A step that is no rivet, and which part it is.
	await page.getByRole('link', { name: 'Plan', exact: true }).click();
	await page.getByRole('link', { name: /^Change ?: Left elevator/ }).click();
	await page.getByRole('combobox', { name: 'Which part' }).selectOption('elevator');
	await page.getByText('Steps that are no rivets').click();
	await page.getByRole('button', { name: 'Add a step' }).click();
	await page.getByRole('button', { name: 'Save the change' }).click();
	await expect(page.getByText('Say what is to be done')).toBeVisible();
	await page.getByRole('textbox', { name: 'What is to be done' }).fill('torque the hinge bolts');
	await page.getByRole('combobox', { name: 'Written down' }).selectOption('a number');
	await page.getByRole('textbox', { name: 'Unit' }).fill('in-lb');
	await page.getByRole('button', { name: 'Save the change' }).click();
	await expect(page.getByText('Changed: Which part and A step.')).toBeVisible();
	await page.reload();
	await page.getByText('Steps that are no rivets').click();
	await expect(page.getByRole('textbox', { name: 'Unit' })).toHaveValue('in-lb');

	// The build: what is changed about it is called so at once, everywhere.
	await page.getByRole('link', { name: 'About the build' }).click();
	await page.getByRole('textbox', { name: 'Name' }).fill('Yarrow Three');
	await page.getByRole('radio', { name: 'millimetres' }).check();
	await page.getByRole('button', { name: 'Save the change' }).click();
	await expect(page.getByText('Changed: Name and Units.')).toBeVisible();
	await expect(page.getByRole('banner').getByText('Yarrow Three')).toBeVisible();

	// Two devices that did not know of each other: of the build and of the assembly.
	for (const [i, device] of devices.entries()) {
		await write(device, 'build.described', { about: `two-seater ${i}` }, { on: [build] });
		await write(device, 'assembly.changed', { note: `note ${i}` }, { assembly, on: [assembly] });
	}
	await expect(page.getByText('Written twice, not settled:')).toBeVisible({ timeout: 20_000 });
	await page.getByRole('button', { name: /^Keep this ?: two-seater 1/ }).click();
	await expect(page.getByText('What it is is settled.')).toBeVisible();
	await expect(page.getByRole('textbox', { name: 'What it is' })).toHaveValue('two-seater 1');
	await page.getByRole('link', { name: /^Change ?: Left elevator/ }).click();
	await page.getByRole('button', { name: /^Keep this ?: note 0/ }).click();
	await expect(page.getByText('Note is settled.')).toBeVisible();
	await expect(page.getByText('Written twice, not settled:')).toHaveCount(0);

	// Closed elsewhere: nothing is changed until it is reopened, with a reason.
	const key = page.getByRole('button', { name: 'Save the change' });
	await expect(key).toBeVisible();
	await write(devices[0], 'assembly.closed', {}, { assembly });
	await expect(key).toHaveCount(0, { timeout: 20_000 });
	await expect(page.getByRole('link', { name: /^Add a seam ?to Left elevator/ })).toHaveCount(0);
	await page.getByRole('button', { name: 'Reopen it' }).click();
	await expect(page.getByText('Say why it is opened again.')).toBeVisible();
	await page.getByRole('textbox', { name: 'Why it is opened again' }).fill('bracket forgotten');
	await page.getByRole('button', { name: 'Reopen it' }).click();
	await expect(page.getByText('Open again.')).toBeVisible();
	await expect(key).toBeVisible();

	await page.getByText('Take the assembly out of the plan').click();
	await page.getByRole('textbox', { name: 'Why', exact: true }).fill('built by the club');
	await page.getByRole('button', { name: 'Take it out' }).click();
	await expect(page.getByText('It is out of the plan.')).toBeVisible();
	await page.getByRole('button', { name: 'Bring it back' }).click();
	await expect(page.getByText('Back in the plan.')).toBeVisible();
	await expect(page.getByText('It is out of the plan.')).toHaveCount(0);
});

test('who is made a builder may plan as soon as the log says so', async ({ page, server }) => {
	const { caller, build } = await plannedElsewhere(server);
	const owner = (await caller.person())?.id ?? '';
	const jo = await (await Caller.registered(server, 'jo')).person();
	await caller.api(owner, `builds/${build}/crew`, { email: jo?.email, role: 'follower' });
	await signIn(page, server, 'jo');
	await page.goto(`${server.url}/builds/${build}/plan`);
	await expect(page.getByText('You follow this build.')).toBeVisible();
	await expect(page.getByRole('link', { name: /^Sync: synced/ })).toBeVisible({ timeout: 20_000 });
	await caller.api(owner, `builds/${build}/crew`, { person: jo?.id, role: 'builder' });
	// The list of builds, which says it too, is asked for once a minute.
	await expect(page.getByRole('link', { name: 'Add an assembly' })).toBeVisible({
		timeout: 10_000
	});
});
