import type { Page } from '@playwright/test';
import { Caller, PASSWORD } from '../support/caller';
import { expect as within, test, type TestServer } from './server';

// Making it is seconds of work on a quiet machine; what is late on a busy one is not what is wrong.
test.describe.configure({ timeout: 240_000 });
const expect = within.configure({ timeout: 60_000 });

const drivenKey = (page: Page) => page.getByRole('button', { name: /^driven \+\d/i });
const band = (page: Page) => page.getByRole('region', { name: 'Example' });
const wall = (page: Page) => page.getByRole('heading', { name: 'Yarrow Two: the wall' });
const base = (page: Page) => /.*\/builds\/[^/]+/.exec(page.url())?.[0] ?? '';

/** Requests about a build or its lines, of every page and of the service worker. */
function requestsAboutBuilds(page: Page): string[] {
	const seen: string[] = [];
	page.context().on('request', (request) => {
		const { pathname } = new URL(request.url());
		if (pathname.startsWith('/api/builds') || pathname === '/api/live')
			seen.push(`${request.method()} ${pathname}`);
	});
	return seen;
}

async function withServiceWorker(page: Page, url: string): Promise<void> {
	await page.goto(url);
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
}

/** From the front page, with one tap. */
async function open(page: Page, server: TestServer): Promise<void> {
	await withServiceWorker(page, server.url);
	await page.getByRole('link', { name: 'Open the example' }).click();
	await expect(wall(page)).toBeAttached();
}

/** To a bench nobody has begun, by the wall. */
async function toTheBench(page: Page): Promise<void> {
	const tail = page.getByRole('article', { name: 'Tail cone' });
	await tail.getByText(/^\d+ seams$/).click();
	await tail.getByRole('link').first().click();
	await expect(driven(page, 0)).toBeVisible();
}

/** At the bench: the wall, which is still there for a moment, counts its parts in the same words. */
const driven = (page: Page, rivets: number) =>
	page
		.getByRole('region', { name: 'The seam' })
		.getByRole('img', { name: new RegExp(`^${rivets} of \\d+ driven`) });

test('signed out, one tap opens the example; a run is in its logbook after a reload, with no server at all', async ({
	page,
	server
}) => {
	const requests = requestsAboutBuilds(page);
	await open(page, server);
	await expect(band(page)).toContainText('nothing here leaves this device');
	await expect(page.getByText(/of 9,0\d\d holes driven/).first()).toBeVisible();
	await toTheBench(page);

	expect(await server.stop()).toBe(0);
	await drivenKey(page).click();
	await expect(driven(page, 5)).toBeVisible();
	await page.reload();
	await expect(driven(page, 5)).toBeVisible();
	await page.goto(`${base(page)}/logbook`);
	const newest = page.getByRole('link', { name: /driven 1–5/ }).first();
	await expect(newest).toContainText('Ana Verhoek');
	// It waits for nothing: it is never sent.
	await expect(newest).not.toContainText('waiting');
	await newest.click();
	await expect(page.getByText('never: it stays on this device')).toBeVisible();
	await page.getByRole('link', { name: 'Crew' }).click();
	await expect(page.getByText('The example is not synced.')).toBeVisible();

	await server.start();
	await page.goto(`${base(page)}/wall`);
	await expect(wall(page)).toBeAttached();
	expect(requests).toEqual([]);
});

test('started over it is as it was; left, nothing of it is on the device', async ({
	page,
	server
}) => {
	const requests = requestsAboutBuilds(page);
	await open(page, server);
	await toTheBench(page);
	await drivenKey(page).click();
	await expect(driven(page, 5)).toBeVisible();
	await page.goto(`${base(page)}/wall`);

	await band(page).getByRole('button', { name: 'Start over' }).click();
	const dialog = page.getByRole('dialog');
	await expect(dialog).toContainText('with it 1 line you wrote in it');
	await dialog.getByRole('button', { name: 'Keep it' }).click();
	await expect(dialog).toBeHidden();
	await band(page).getByRole('button', { name: 'Start over' }).click();
	await dialog.getByRole('button', { name: 'Start over' }).click();
	await expect(page.getByRole('article', { name: 'Tail cone' })).toContainText(/(^|\D)0\s*of 724/);
	await toTheBench(page);
	await page.goto(`${base(page)}/wall`);

	await band(page).getByRole('button', { name: 'Leave' }).click();
	await expect(dialog).toContainText('It is deleted from this device.');
	await dialog.getByRole('button', { name: 'Leave' }).click();
	await expect(page.getByRole('heading', { level: 1, name: /on record/ })).toBeVisible();
	await expect
		.poll(() =>
			page.evaluate(async () => (await indexedDB.databases()).map(({ name }) => name ?? ''))
		)
		.not.toContainEqual(expect.stringContaining('example'));
	expect(requests).toEqual([]);
});

test('closed while it was made, it is made anew by who opens it next', async ({
	page,
	context,
	server
}) => {
	await withServiceWorker(page, server.url);
	await page.getByRole('link', { name: 'Open the example' }).click();
	await expect(page.getByText(/Making the example: [1-9]\d* of 130 seams/)).toBeVisible();
	await page.close();
	const next = await context.newPage();
	await next.goto(server.url);
	await next.getByRole('link', { name: 'Open the example' }).click();
	await expect(wall(next)).toBeAttached();
	await expect(next.getByText(/of 9,0\d\d holes driven/).first()).toBeVisible();
});

test('who is signed in reaches it from their builds, and it is none of them', async ({
	page,
	server
}) => {
	await Caller.registered(server, 'bert');
	await page.goto(`${server.url}/sign-in`);
	await page.getByRole('textbox', { name: 'E-mail address' }).fill('bert@example.org');
	await page.getByRole('textbox', { name: 'Password' }).fill(PASSWORD);
	await page.getByRole('button', { name: 'Sign in' }).click();
	await page.waitForURL('**/builds');
	const sent: string[] = [];
	page.on('request', (request) => {
		if (request.method() !== 'GET') sent.push(request.url());
	});
	await page.getByRole('link', { name: 'Open the example' }).click();
	await expect(wall(page)).toBeAttached();
	await toTheBench(page);
	await drivenKey(page).click();
	await expect(driven(page, 5)).toBeVisible();
	await page.goto(`${server.url}/builds`);
	await expect(page.getByText('None is on this device yet.')).toBeVisible();
	await page.goto(`${server.url}/sync`);
	await expect(page.getByText('The example is not among them')).toBeVisible();
	await expect(page.getByText('Yarrow Two')).toBeHidden();
	// Bert’s own sync found nothing to send.
	expect(sent.filter((url) => /entries|have/.test(url))).toEqual([]);
});
