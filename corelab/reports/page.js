(function () {
  'use strict';
  var data = JSON.parse(document.getElementById('data').textContent);
  var plots = Array.prototype.slice.call(document.querySelectorAll('svg.plot'));
  var rows = Array.prototype.slice.call(document.querySelectorAll('#table tbody tr'));
  var body = document.querySelector('#table tbody');
  var filter = document.getElementById('filter'), lit = document.getElementById('lit');
  var count = document.getElementById('count'), tip = document.getElementById('tip');
  var points = {}, picked = null;
  plots.forEach(function (plot) {
    Array.prototype.forEach.call(plot.querySelectorAll('.p'), function (p) {
      var i = p.getAttribute('data-i');
      (points[i] = points[i] || []).push(p);
    });
  });
  function show() {
    Object.keys(points).forEach(function (i) {
      var state = picked === null ? 'p' : picked[i] ? 'p on' : 'p off';
      points[i].forEach(function (p) { if (p.getAttribute('class') !== state) p.setAttribute('class', state); });
    });
    table();
  }
  function table() {
    var text = filter.value.trim().toLowerCase(), shown = 0;
    rows.forEach(function (row) {
      var on = picked !== null && picked[row.getAttribute('data-i')];
      var hidden = (text && row.textContent.toLowerCase().indexOf(text) < 0) || (lit.checked && picked !== null && !on);
      row.hidden = !!hidden;
      row.className = on ? 'lit' : '';
      if (!hidden) shown += 1;
    });
    var many = picked === null ? 0 : Object.keys(picked).length;
    count.textContent = shown + ' of ' + rows.length + ' plugs' + (picked === null ? '' : ', ' + many + ' lit up');
  }
  function place(plot, event) {
    var at = plot.createSVGPoint();
    at.x = event.clientX; at.y = event.clientY;
    return at.matrixTransform(plot.getScreenCTM().inverse());
  }
  plots.forEach(function (plot) {
    var start = null, box = plot.querySelector('.brush'), alone = plot.getAttribute('data-kind') === 'depth';
    var view = plot.viewBox.baseVal;
    function draw(a, b) {
      var x0 = alone ? 0 : Math.min(a.x, b.x), x1 = alone ? view.width : Math.max(a.x, b.x);
      var y0 = Math.min(a.y, b.y), y1 = Math.max(a.y, b.y);
      box.setAttribute('x', x0); box.setAttribute('y', y0);
      box.setAttribute('width', x1 - x0); box.setAttribute('height', y1 - y0);
      picked = {};
      Array.prototype.forEach.call(plot.querySelectorAll('.p'), function (p) {
        var x = +p.getAttribute('data-x'), y = +p.getAttribute('data-y');
        if (x >= x0 && x <= x1 && y >= y0 && y <= y1) picked[p.getAttribute('data-i')] = true;
      });
      show();
    }
    plot.addEventListener('pointerdown', function (event) {
      start = place(plot, event);
      plots.forEach(function (other) { other.querySelector('.brush').setAttribute('width', 0); });
      plot.setPointerCapture(event.pointerId);
      event.preventDefault();
    });
    plot.addEventListener('pointermove', function (event) {
      if (start) { draw(start, place(plot, event)); return; }
      hover(plot, event);
    });
    plot.addEventListener('pointerup', function (event) {
      if (!start) return;
      var end = place(plot, event);
      if (Math.abs(end.x - start.x) + Math.abs(end.y - start.y) < 4) {
        picked = null; box.setAttribute('width', 0); show();
      } else { draw(start, end); }
      start = null;
    });
    plot.addEventListener('pointerleave', function () { tip.hidden = true; });
  });
  function hover(plot, event) {
    var at = place(plot, event), best = null, least = 64;
    Array.prototype.forEach.call(plot.querySelectorAll('.p'), function (p) {
      var dx = p.getAttribute('data-x') - at.x, dy = p.getAttribute('data-y') - at.y, d = dx * dx + dy * dy;
      if (d < least) { least = d; best = p; }
    });
    if (!best) { tip.hidden = true; return; }
    var row = data.rows[+best.getAttribute('data-i')];
    tip.textContent = '';
    data.columns.forEach(function (name, i) {
      var value = row[i];
      if (value === null || value === '' || name.indexOf('u ') === 0) return;
      var wanted = /^(plug|source|run|depth|facies|lithology|porosity \[|klinkenberg|grain density|oil sat|water sat|crush|status|flags)/;
      if (!wanted.test(name)) return;
      var line = document.createElement('div');
      line.textContent = name + ': ' + (typeof value === 'number' ? Number(value.toPrecision(5)) : value);
      tip.appendChild(line);
    });
    tip.hidden = false;
    tip.style.left = Math.min(event.clientX + 14, window.innerWidth - 330) + 'px';
    tip.style.top = Math.min(event.clientY + 14, window.innerHeight - tip.offsetHeight - 8) + 'px';
  }
  var parts = function (text) {
    return text.toLowerCase().split(/(\d+(?:\.\d+)?)/).filter(String);
  };
  function compare(a, b) {
    if (a === b) return 0;
    if (a === '') return 1;
    if (b === '') return -1;
    var x = Number(a), y = Number(b);
    if (!isNaN(x) && !isNaN(y)) return x - y;
    var p = parts(a), q = parts(b);
    for (var i = 0; i < Math.min(p.length, q.length); i += 1) {
      var m = Number(p[i]), n = Number(q[i]);
      if (!isNaN(m) && !isNaN(n)) { if (m !== n) return m - n; } else if (p[i] !== q[i]) return p[i] < q[i] ? -1 : 1;
    }
    return p.length - q.length;
  }
  var heads = Array.prototype.slice.call(document.querySelectorAll('#table th'));
  function sort(head) {
    var up = head.getAttribute('aria-sort') !== 'ascending', c = +head.getAttribute('data-c');
    heads.forEach(function (other) { other.setAttribute('aria-sort', 'none'); });
    head.setAttribute('aria-sort', up ? 'ascending' : 'descending');
    var order = rows.map(function (row, i) { return [row.cells[c].textContent, i, row]; });
    order.sort(function (a, b) {
      var d = compare(a[0], b[0]);
      if (a[0] !== '' && b[0] !== '' && !up) d = -d;
      return d || a[1] - b[1];
    });
    order.forEach(function (entry) { body.appendChild(entry[2]); });
  }
  heads.forEach(function (head) {
    head.addEventListener('click', function () { sort(head); });
    head.addEventListener('keydown', function (event) { if (event.key === 'Enter') sort(head); });
  });
  filter.addEventListener('input', table);
  lit.addEventListener('change', table);
  table();
})();
