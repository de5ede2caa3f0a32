/** `npm run audit`: the screens in every role, state and theme, and Lighthouse on the main ones; a table of each. */
import { chromium, type Browser } from '@playwright/test';
import config from '../../playwright.config';
import type { Role } from '../../src/lib/logbook/kinds';
import { TestServer } from '../e2e/server';
import { Audience } from './audience';
import { violations } from './axe';
import { fill, type Filled, type Size } from './fill';
import { lighthouseAll, PERFORMANCE } from './lighthouse';
import { OFFLINE, type Screen } from './screens';

const ROLES: readonly Role[] = ['owner', 'builder', 'inspector', 'follower'];
const THEMES = ['light', 'dark'] as const;

/** @returns whether everything that must be 100 is */
export async function audit(only: readonly string[]): Promise<boolean> {
	const wanted = (part: string) => only.length === 0 || only.includes(part);
	// A list three times as long has the same faults, and axe looks at each row.
	const clean = !wanted('axe') || (await filledWith({ entries: 700, seams: 40 }, withAxe));
	// The whole plan of the example, and most of a year.
	const hundred =
		!wanted('lighthouse') || (await filledWith({ entries: 2000, seams: 130 }, withLighthouse));
	return clean && hundred;
}

async function filledWith(
	size: Size,
	work: (url: string, filled: Filled) => Promise<boolean>
): Promise<boolean> {
	const server = await TestServer.start({ LOG_LEVEL: 'info' });
	try {
		return await work(server.url, await fill(server, size));
	} finally {
		await server.dispose();
	}
}

interface Count {
	screens: number;
	light: number;
	dark: number;
}

async function withAxe(url: string, filled: Filled): Promise<boolean> {
	const counts = new Map<string, Count>();
	const browser = await chromium.launch(config.use?.launchOptions);
	try {
		for (const role of ROLES) {
			console.log(`the screens of the ${role}`);
			await inRole(browser, url, filled, role, counts);
		}
	} finally {
		await browser.close();
	}
	console.log(`\n${row('axe', 'screens', ...THEMES)}`);
	for (const [name, { screens, light, dark }] of counts)
		console.log(row(name, screens, light, dark));
	return [...counts.values()].every(({ light, dark }) => light + dark === 0);
}

async function inRole(
	browser: Browser,
	url: string,
	filled: Filled,
	role: Role,
	counts: Map<string, Count>
): Promise<void> {
	const audience = await Audience.open(browser, url, filled, role);
	const look = async (screen: Screen, state: string) => {
		const name = `${screen.who === 'crew' ? role : screen.who}, ${state}`;
		const count = counts.get(name) ?? { screens: 0, light: 0, dark: 0 };
		counts.set(name, count);
		count.screens++;
		const page = await audience.at(screen);
		for (const theme of THEMES) {
			await page.emulateMedia({ colorScheme: theme });
			const found = await violations(page);
			count[theme] += found.length;
			for (const one of found) console.log(`${name}, ${screen.name}, ${theme}: ${one}`);
		}
		await page.emulateMedia({ colorScheme: 'light' });
	};
	// Who is not of the crew sees the same whoever else looks.
	const once = ({ who }: Screen) => who === 'crew' || role === 'owner';
	try {
		for (const screen of audience.screens.filter(once)) await look(screen, screen.state);
		await audience.withoutNetwork(async () => {
			for (const screen of OFFLINE.filter(once)) await look(screen, 'offline');
		});
	} finally {
		await audience.close();
	}
}

async function withLighthouse(url: string, filled: Filled): Promise<boolean> {
	const scores = await lighthouseAll(url, filled);
	console.log(
		`\n${row('Lighthouse, mobile', 'accessibility', 'best practices', `performance (goal ${PERFORMANCE})`)}`
	);
	for (const { name, accessibility, bestPractices, performance, failing } of scores) {
		console.log(row(name, accessibility, bestPractices, performance));
		for (const one of failing) console.log(`    ${one}`);
	}
	return scores.every(
		({ accessibility, bestPractices }) => accessibility === 100 && bestPractices === 100
	);
}

function row(name: string, ...cells: readonly (string | number)[]): string {
	return name.padEnd(24) + cells.map((cell) => String(cell).padStart(16)).join('');
}
