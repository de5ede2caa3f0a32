import { join } from 'node:path';
import { ROOT } from '../../src/bin/prepare.js';

/**
 * `fill.ts`. Playwright reads no `?raw` and vite does; imported only when called, so that the tests are listed without it.
 */
export async function loadFill(): Promise<typeof import('./fill')> {
	const { runnerImport } = await import('vite');
	const { module } = await runnerImport<typeof import('./fill')>(
		join(ROOT, 'tests/audit/fill.ts'),
		{
			configFile: false,
			root: ROOT,
			logLevel: 'error',
			resolve: { alias: { $lib: join(ROOT, 'src/lib') } }
		}
	);
	return module;
}
