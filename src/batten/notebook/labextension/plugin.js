/* The part of batten that lives in the page: puts a cell below a widget when the kernel asks for it.
 *
 * The kernel opens a short-lived comm with {op, source, cell_id, button, client, unless} and gets its answer in the
 * message that closes it: {status, reason, index, cell_id}. Nothing is run, and nothing is sent unasked.
 *
 * Written for the module-federation container that JupyterLab 4 and Notebook 7 load (init, get), so that it needs no
 * bundler. The names in capitals are repeated in insertion.py.
 */
(() => {
  'use strict';

  const NAME = 'batten-insert';
  const TARGET = 'batten.insert';
  const BUTTON_PREFIX = 'batten-button-';
  const KEYS_CLASS = 'batten-keys';

  // Class of a button -> the panel and the cell in which it was last clicked. One widget can be shown in several
  // cells, and only the page knows which of them was used.
  const clicks = new Map();

  function noteClick(tracker, event) {
    const button = event.target.closest?.(`[class*="${BUTTON_PREFIX}"]`);
    if (!button) return;
    const token = [...button.classList].find(name => name.startsWith(BUTTON_PREFIX));
    clicks.delete(token); // a click outside every notebook (a separate view of the output) leaves no cell behind
    tracker.forEach(panel => {
      const cell = panel.content.widgets.find(widget => widget.node.contains(button));
      if (cell) clicks.set(token, { panel, cellId: cell.model.id });
    });
  }

  const positionOf = (panel, cellId) =>
    panel.content.model ? panel.content.model.sharedModel.cells.findIndex(cell => cell.id === cellId) : -1;

  /* The cell of the click if it is known, else the cell that made the widget, in any panel on this kernel. */
  function locate(tracker, kernel, request) {
    const click = clicks.get(request.button);
    if (click && !click.panel.isDisposed) return { panel: click.panel, index: positionOf(click.panel, click.cellId) };
    const panel = tracker.find(
      each => each.sessionContext.session?.kernel?.id === kernel.id && positionOf(each, request.cell_id) >= 0
    );
    return panel ? { panel, index: positionOf(panel, request.cell_id) } : { panel: null, index: -1 };
  }

  async function select(notebook, index) {
    notebook.mode = 'command';
    notebook.activeCellIndex = index;
    notebook.deselectAll();
    await notebook.scrollToItem(index, 'smart');
    // Shift+Enter must now run the new cell, not press the button a second time.
    if (notebook.activeCellIndex === index) notebook.activate();
  }

  function insert(app, tracker, kernel, request) {
    const { panel, index } = locate(tracker, kernel, request);
    if (index < 0) return { status: 'error', reason: 'cell-not-found' };
    const earlier = request.unless ? positionOf(panel, request.unless) : -1;
    if (earlier >= 0) return { status: 'already', index: earlier, cell_id: request.unless };

    const notebook = panel.content;
    const shared = notebook.model.sharedModel;
    // Whoever went on to another cell or panel while the kernel was at work keeps the selection and the keyboard.
    const stillHere = notebook.activeCellIndex === index && app.shell.currentWidget === panel;
    // Edits less than half a second apart would be undone together; this one is to be undone alone.
    shared.undoManager?.stopCapturing();
    const cell = shared.insertCell(index + 1, { cell_type: 'code', source: request.source, metadata: { trusted: true } });
    shared.undoManager?.stopCapturing();
    if (stillHere) select(notebook, index + 1).catch(error => console.warn(`${NAME}: ${error}`));
    return { status: 'inserted', index: index + 1, cell_id: cell.id };
  }

  function listen(app, tracker, kernel) {
    kernel?.registerCommTarget(TARGET, (comm, message) => {
      const request = message.content.data;
      if (request.client && request.client !== kernel.clientId) {
        comm.dispose(); // another tab holds the click: it answers, this one stays silent
        return;
      }
      let answer = { status: 'error', reason: 'error', detail: `unknown request ${request.op}` };
      try {
        if (request.op === 'insert') answer = insert(app, tracker, kernel, request);
      } catch (error) {
        answer.detail = String(error);
      }
      comm.close(answer);
    });
  }

  /* Inside a batten widget, plain keys belong to its controls: an arrow moves in a list and "b" adds no cell. Escape
   * goes back to the cell. Shift+Enter and whatever is held with Ctrl, Alt or Cmd stay the front end's. */
  function keepPlainKeys(event) {
    const control = event.target;
    if (!control.closest?.(`.${KEYS_CLASS}`)) return;
    const theirs = event.ctrlKey || event.metaKey || event.altKey || (event.shiftKey && event.key === 'Enter');
    // On the control itself, since shortcuts are looked up from there outwards.
    control.toggleAttribute('data-lm-suppress-shortcuts', !theirs);
    if (event.key === 'Escape') control.closest('.jp-Notebook-cell')?.focus();
  }

  function activate(app, tracker) {
    // On the window and in the capture phase: before the front end's own listeners.
    window.addEventListener('click', event => noteClick(tracker, event), true);
    window.addEventListener('keydown', keepPlainKeys, true);
    const follow = panel => {
      listen(app, tracker, panel.sessionContext.session?.kernel);
      panel.sessionContext.kernelChanged.connect((_, change) => listen(app, tracker, change.newValue));
    };
    tracker.forEach(follow);
    tracker.widgetAdded.connect((_, panel) => follow(panel));
  }

  /* The copy of a shared module that the front end uses: the one already loaded, else the newest. */
  function shared(scope, name) {
    const versions = scope[name];
    const newer = (a, b) => a.localeCompare(b, 'en', { numeric: true }) > 0;
    const version = Object.keys(versions).reduce((best, each) =>
      !versions[best].loaded && (versions[each].loaded || newer(each, best)) ? each : best
    );
    return versions[version].get();
  }

  let scope;
  const container = {
    init(shareScope) {
      scope = shareScope;
    },
    async get() {
      const { INotebookTracker } = (await shared(scope, '@jupyterlab/notebook'))();
      const plugin = { id: `${NAME}:plugin`, autoStart: true, requires: [INotebookTracker], activate };
      return () => ({ __esModule: true, default: plugin });
    }
  };

  window._JUPYTERLAB = window._JUPYTERLAB || {};
  window._JUPYTERLAB[NAME] = container;
})();
