#!/usr/bin/env node
/**
 * First act: say plainly when this Node is too old. Nothing else may be imported before that, since the rest does
 * not even load there.
 */
const [major = 0, minor = 0] = process.versions.node.split('.').map(Number);

if (major < 22 || (major === 22 && minor < 12)) {
  process.stderr.write(
    `humledger needs Node.js 22.12 or later; this is ${process.versions.node}. Install a newer Node.js and start again.\n`,
  );
  process.exitCode = 1;
} else {
  // Whoever reads the output may have seen enough ('... | head').
  process.stdout.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code !== 'EPIPE') throw error;
    process.exit(0);
  });
  const { main } = await import('./main.ts');
  process.exitCode = await main(process.argv.slice(2));
}
