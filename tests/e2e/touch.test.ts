import type { Page } from '@playwright/test';
import { tooSmall } from '../audit/touch';
import { expect, test } from './audited';

/** A phone upright, lying down, and a desk. */
const VIEWPORTS = [
	{ width: 412, height: 823 },
	{ width: 823, height: 412 },
	{ width: 1280, height: 800 }
];

test.describe.configure({ timeout: 600_000 });
test.use({ trace: 'off' });

test('the measure itself: boxes with their labels, links in sentences, what nobody sees', async ({
	page
}) => {
	await page.setContent(`
		<p>Already here? <a href="#a">In a sentence</a></p>
		<p><a href="#b">Alone</a></p>
		<label style="display: block; width: 60px; height: 60px"><input type="checkbox" name="box" /></label>
		<input type="radio" name="bare" />
		<button style="width: 60px; height: 30px">Low</button>
		<button style="width: 60px; height: 60px">Large</button>
		<button hidden>Gone</button>
		<details><summary style="height: 60px">More</summary><button>Folded away</button></details>`);
	const found = await tooSmall(page, 44);
	expect(found.map((one) => /“(.*)”/.exec(one)?.[1])).toEqual(['Alone', 'bare', 'Low']);
	expect(await tooSmall(page, 61)).toHaveLength(6);
});

test('what is touched is large enough, in gloves at the bench and with a finger elsewhere', async ({
	audience
}) => {
	for (const screen of audience.screens) {
		await test.step(screen.name, async () => {
			const page = await audience.at(screen);
			for (const viewport of VIEWPORTS) {
				await page.setViewportSize(viewport);
				const where = `${screen.name} at ${viewport.width} x ${viewport.height}`;
				expect.soft(await tooSmall(page, 44), where).toEqual([]);
				if (screen.gloves !== undefined)
					expect.soft(await tooSmall(page, 64, screen.gloves), where).toEqual([]);
				if (screen.name === 'bench') await expectKeysApart(page, where);
			}
		});
	}
});

/** DRIVEN and DEFECT: 96 px each way, and 13 mm between them. */
async function expectKeysApart(page: Page, where: string): Promise<void> {
	const [defect, driven] = await Promise.all(
		[/^DEFECT$/, /^driven \+\d/i].map((name) => page.getByRole('button', { name }).boundingBox())
	);
	if (!defect || !driven) throw new Error('the two keys are not there');
	for (const { width, height } of [defect, driven]) {
		expect.soft(width, where).toBeGreaterThanOrEqual(96);
		expect.soft(height, where).toBeGreaterThanOrEqual(96);
	}
	const between = (from: number, size: number, to: number, other: number) =>
		Math.max(to - (from + size), from - (to + other));
	const apart = Math.max(
		between(defect.x, defect.width, driven.x, driven.width),
		between(defect.y, defect.height, driven.y, driven.height)
	);
	expect.soft(apart, where).toBeGreaterThanOrEqual(49);
}
