import { existsSync } from 'node:fs';
import { defineConfig } from '@playwright/test';

const debian = '/usr/bin/chromium';

export default defineConfig({
	testDir: 'tests',
	testMatch: ['e2e/**/*.test.ts', 'faults/**/*.test.ts'],
	globalSetup: './tests/e2e/global-setup.ts',
	fullyParallel: true,
	workers: 2,
	// A test that passes the second time has found something.
	retries: 0,
	forbidOnly: Boolean(process.env.CI),
	timeout: 90_000,
	// Two browsers and a server share two cores; what is late is not what is wrong.
	expect: { timeout: 15_000 },
	reporter: 'list',
	use: {
		trace: 'retain-on-failure',
		launchOptions: {
			executablePath: process.env.CHROMIUM_PATH || (existsSync(debian) ? debian : undefined),
			// The browser reaches for its maker's hosts without these; a sandbox needs a user who is
			// not root.
			args: [
				'--no-sandbox',
				'--disable-gpu',
				'--disable-quic',
				'--no-first-run',
				'--disable-background-networking',
				'--disable-component-update',
				'--disable-sync'
			]
		}
	}
});
