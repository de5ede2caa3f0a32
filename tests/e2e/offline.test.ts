import { expect, test } from './server';

test('with the server gone, a page never visited opens by its address', async ({
	page,
	context,
	server
}) => {
	await page.goto(`${server.url}/`);
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
	expect(await server.stop()).toBe(0);

	const later = await context.newPage();
	await later.goto(`${server.url}/builds`);
	await expect(later.getByRole('heading', { name: 'Nobody is signed in here' })).toBeVisible();

	// One that only the server can draw says so instead of staying blank.
	await later.goto(`${server.url}/sign-in`);
	await expect(later.getByRole('main')).toBeVisible();
});

test('the service worker never answers for the log itself', async ({ page, server }) => {
	await page.goto(`${server.url}/`);
	await page.evaluate(async () => {
		await navigator.serviceWorker.ready;
	});
	await page.goto(`${server.url}/`);
	await server.stop();
	const answered = await page.evaluate(() =>
		fetch('/api/live').then(
			() => true,
			() => false
		)
	);
	expect(answered).toBe(false);
});
