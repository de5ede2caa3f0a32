import { violationsInBoth } from '../audit/axe';
import { NEVER_ALONE, OFFLINE, pagesOfTheApp, SCREENS } from '../audit/screens';
import { expect, test } from './audited';

// One after the other in one browser, and with no trace of it all: it would cost more than the looking.
test.describe.configure({ mode: 'default', timeout: 900_000 });
test.use({ trace: 'off' });

test('every page of the app is among the screens that are looked at', () => {
	const looked = new Set([...SCREENS.map(({ route }) => route), ...NEVER_ALONE]);
	expect([...looked].sort()).toEqual(pagesOfTheApp());
});

test('axe finds nothing on any screen, in either theme', async ({ audience }) => {
	for (const screen of audience.screens) {
		await test.step(screen.name, async () => {
			const page = await audience.at(screen);
			expect.soft(await violationsInBoth(page), screen.name).toEqual([]);
		});
	}
});

test('nor with no network', async ({ audience }) => {
	// One from the device, one of the server, one for nobody; `npm run audit` has them all.
	const few = ['bench', 'crew', 'builds, nobody signed in'];
	await audience.withoutNetwork(async () => {
		for (const screen of OFFLINE.filter(({ name }) => few.includes(name))) {
			await test.step(screen.name, async () => {
				const page = await audience.at(screen);
				expect.soft(await violationsInBoth(page), screen.name).toEqual([]);
			});
		}
	});
});
