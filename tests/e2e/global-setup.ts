import { build, isBuilt } from '../../src/bin/prepare.js';

/** End-to-end tests run the real build; one made from older sources would prove nothing. */
export default async function globalSetup(): Promise<void> {
	if (isBuilt()) return;
	const { code, output } = await build();
	if (code !== 0) throw new Error(`the build failed:\n${output}`);
}
