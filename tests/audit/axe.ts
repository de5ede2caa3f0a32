import { AxeBuilder } from '@axe-core/playwright';
import type { Page } from '@playwright/test';

const TAGS = ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'];
/** The rules that look at colours: all that can differ in the other theme. */
const OF_COLOUR = ['color-contrast', 'link-in-text-block'];

/**
 * What axe finds wrong with the page as it is, one line for each place. What it could not tell counts too, but for the
 * contrast on hatched and clipped areas, which `app.test.ts` computes from the tokens.
 */
export async function violations(
	page: Page,
	rules: 'all' | 'of colour' = 'all'
): Promise<string[]> {
	// In one piece: there are no frames, and the other way opens a page more each time.
	const axe = new AxeBuilder({ page })
		.setLegacyMode()
		// Of what is in order it need not say where.
		.options({ resultTypes: ['violations', 'incomplete'] });
	const found = await (rules === 'all' ? axe.withTags(TAGS) : axe.withRules(OF_COLOUR)).analyze();
	const unsure = found.incomplete.filter(({ id }) => id !== 'color-contrast');
	return [...found.violations, ...unsure].flatMap(({ id, help, nodes }) =>
		nodes.map(({ target, html, failureSummary = '' }) =>
			[
				`${id}: ${help}`,
				target.join(' '),
				html.slice(0, 200),
				failureSummary.split('\n').slice(1).join('; ').trim()
			].join(' | ')
		)
	);
}

/** The same in both themes. @returns nothing where nothing is wrong in either */
export async function violationsInBoth(page: Page): Promise<string[]> {
	const light = await violations(page);
	await page.emulateMedia({ colorScheme: 'dark' });
	const dark = await violations(page, 'of colour');
	await page.emulateMedia({ colorScheme: 'light' });
	return [...light, ...dark.map((one) => `dark: ${one}`)];
}
