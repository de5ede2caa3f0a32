import { Caller, PASSWORD } from '../support/caller';
import { driveHoles, enrol, makeDevice, openBuild, planSeam, sealedPush } from '../support/people';
import { expect, test } from './server';

test('what a follower drove waits for the owner, who sees it in words and decides; offline the list says so', async ({
	page,
	context,
	server
}) => {
	const owner = await Caller.registered(server, 'ana');
	const follower = await Caller.registered(server, 'jo');
	const [ana, jo] = await Promise.all([owner.person(), follower.person()]);
	const device = await makeDevice(ana?.id);
	const { build, opened, enrolled } = openBuild(device);
	const { seam, lines } = planSeam(device, build, 20);
	await owner.push(
		ana?.id ?? '',
		build,
		await sealedPush(device, build, [opened, enrolled, ...lines])
	);
	await owner.api(ana?.id ?? '', `builds/${build}/crew`, {
		email: 'jo@example.org',
		role: 'follower'
	});
	const theirs = await makeDevice(jo?.id);
	theirs.n = 100;
	await follower.push(
		jo?.id ?? '',
		build,
		await sealedPush(theirs, build, [
			enrol(theirs, build),
			driveHoles(theirs, build, seam, 1, 5),
			driveHoles(theirs, build, seam, 6, 7)
		])
	);

	await page.goto(`${server.url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill('ana@example.org');
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
	await page.goto(`${server.url}/builds/${build}/not-accepted`);

	const first = page.getByRole('listitem').filter({ hasText: 'Rear spar: driven 1–5' });
	await expect(first).toContainText('written by jo, brought by jo');
	await expect(first).toContainText('Your role in this build does not include this');
	await first.getByRole('button', { name: 'Accept' }).click();
	await expect(first).toContainText('Accepted. It is in the log.');
	const second = page.getByRole('listitem').filter({ hasText: 'Rear spar: driven 6–7' });
	await second.getByRole('button', { name: 'Discard' }).click();
	await expect(second).toContainText('Discarded.');
	await expect(page.getByText('Nothing waits for your decision.')).toBeVisible();

	await page.goto(`${server.url}/builds/${build}/logbook`);
	await expect(page.getByRole('link', { name: /driven 1–5/ })).toBeVisible();

	await context.setOffline(true);
	await page.goto(`${server.url}/builds/${build}/not-accepted`);
	await expect(page.getByText('This list is on the server and needs a network.')).toBeVisible();
});

test('a line whose id another has in the log is looked at, exported and let go', async ({
	page,
	context,
	server
}) => {
	test.slow();
	const caller = await Caller.registered(server, 'ana');
	const person = (await caller.person())?.id ?? '';
	const device = await makeDevice(person);
	const { build, opened, enrolled } = openBuild(device);
	const { seam, lines } = planSeam(device, build, 20);
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
	await expect(page.getByText('0 of 20 driven').first()).toBeVisible();
	await context.setOffline(true);
	await page.getByRole('button', { name: /^driven \+5/i }).click();
	await expect(page.getByText('5 of 20 driven').first()).toBeVisible();

	// Meanwhile a copy of the device wrote another line under the same id, and it was first.
	await page.goto(`${server.url}/builds/${build}/logbook`);
	const link = await page.getByRole('link', { name: /driven 1–5/ }).getAttribute('href');
	const id = link?.split('/').at(-1) ?? '';
	device.n += 50;
	const other = driveHoles(device, build, seam, 11, 12, { id });
	await caller.push(person, build, await sealedPush(device, build, [other]));
	await context.setOffline(false);

	await page.getByRole('link', { name: /1 not accepted/ }).click({ timeout: 30_000 });
	await page.getByRole('link', { name: 'Rear spar: driven 1–5' }).click();
	const line = page.getByRole('listitem').filter({ hasText: 'Rear spar: driven 1–5' });
	await expect(line).toContainText('In the log under its id: Rear spar: driven 11–12');
	await line.getByText('Look at it').click();
	await expect(line.locator('pre')).toContainText('"holes":[{"from":1,"to":5}]');
	const downloads = page.waitForEvent('download');
	await line.getByRole('button', { name: 'Export this line' }).click();
	expect((await downloads).suggestedFilename()).toBe(`line-${id}.json`);
	await line.getByText('Let it go', { exact: true }).click();
	await expect(line).toContainText('Lost for good: Rear spar: driven 1–5');
	await line.getByRole('button', { name: 'Let it go for good' }).click();
	await expect(page.getByText('Let go: Rear spar: driven 1–5.')).toBeVisible();
	await expect(line).toHaveCount(0);
	await expect(page.getByText(/not accepted$/)).toHaveCount(0);
	await page.goto(`${server.url}/builds/${build}/bench/${seam}`);
	await expect(page.getByText('2 of 20 driven').first()).toBeVisible();
});
