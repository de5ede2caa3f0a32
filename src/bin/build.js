// `npm run build`
import { build } from './prepare.js';

const { code } = await build({ show: true });
process.exitCode = code;
