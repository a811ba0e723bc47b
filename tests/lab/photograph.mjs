// Opens one notebook in a running JupyterLab, runs all its cells and photographs the page.
//
// Arguments: browser, address of the server, token, name of the notebook, path of the picture. Ends with status 1 if a
// cell fails or the page reports an error; the picture is taken then as well.
import { chromium } from 'playwright-core';

const [executablePath, server, token, notebook, picture] = process.argv.slice(2);
const patience = 60000;
const errors = [];

async function untilServed() {
  const end = Date.now() + patience;
  while (Date.now() < end) {
    const answer = await fetch(`${server}/api/status?token=${token}`).catch(() => null);
    if (answer?.ok) return;
    await new Promise(resolve => setTimeout(resolve, 100));
  }
  throw new Error('the server does not answer');
}

await untilServed();
const browser = await chromium.launch({
  executablePath,
  headless: true,
  args: ['--no-sandbox', '--disable-gpu', '--disable-dev-shm-usage'],
});
try {
  const page = await browser.newPage({ viewport: { width: 1280, height: 900 } });
  page.setDefaultTimeout(patience);
  // A message of the kernel that is not valid shows up here and nowhere else.
  page.on('pageerror', error => errors.push(String(error)));
  page.on('console', line => {
    if (line.text().includes('Kernel message validation')) errors.push(line.text());
  });
  // `reset` keeps the page from opening what an earlier session left.
  await page.goto(`${server}/lab/tree/${encodeURIComponent(notebook)}?token=${token}&reset`, {
    waitUntil: 'domcontentloaded',
  });
  await page.waitForFunction(() => !!window.jupyterapp);
  await page.evaluate(async () => {
    await window.jupyterapp.restored;
  });
  await page.locator('.jp-NotebookPanel').waitFor();
  // The splash and the busy light are both too early; the application knows when the kernel is there.
  await page.waitForFunction(
    () => {
      const context = window.jupyterapp.shell.currentWidget?.sessionContext;
      const kernel = context?.session?.kernel;
      return context?.isReady && kernel?.status === 'idle' && kernel.connectionStatus === 'connected';
    },
    null,
    { polling: 100 },
  );
  // The file browser takes a third of the picture and shows nothing of ours.
  await page.evaluate(() => window.jupyterapp.shell.collapseLeft());
  const ran = await page.evaluate(() => window.jupyterapp.commands.execute('notebook:run-all-cells'));
  const prompts = await page.locator('.jp-NotebookPanel .jp-CodeCell .jp-InputPrompt').allTextContents();
  console.log(`${prompts.length} code cells ran: ${prompts.join(' ')}`);
  if (!ran) errors.push('a cell failed');

  // The notebook scrolls inside the page: the window is made as high as the notebook, so that all of it is shown.
  const height = await page.evaluate(async () => {
    const panel = window.jupyterapp.shell.currentWidget.content.node;
    const scroller = panel.querySelector('.jp-WindowedPanel-outer') ?? panel;
    scroller.scrollTop = 0;
    const cells = [...panel.querySelectorAll('.jp-Cell')];
    return cells.reduce((sum, cell) => sum + cell.getBoundingClientRect().height, 0);
  });
  await page.setViewportSize({ width: 1280, height: Math.min(Math.max(Math.ceil(height) + 260, 600), 12000) });
  await page.waitForTimeout(500);
  await page.screenshot({ path: picture });
  await page.evaluate(() => window.jupyterapp.shell.currentWidget.sessionContext.shutdown());
} catch (error) {
  errors.push(String(error));
  for (const open of browser.contexts().flatMap(context => context.pages())) {
    await open.screenshot({ path: picture }).catch(() => {});
  }
} finally {
  await browser.close();
}
for (const error of errors) console.error(error);
process.exit(errors.length ? 1 : 0);
