/** `npm start`: installs what is missing, serves the app and prints its address. */
import { spawn } from 'node:child_process';
import path from 'node:path';
import { ensurePackages, root } from './setup.mjs';

ensurePackages();
const vite = path.join(root, 'node_modules', 'vite', 'bin', 'vite.js');
const server = spawn(process.execPath, [vite, ...process.argv.slice(2)], { cwd: root, stdio: 'inherit' });
server.on('exit', (code) => process.exit(code ?? 0));
for (const signal of ['SIGINT', 'SIGTERM']) process.on(signal, () => server.kill(signal));
