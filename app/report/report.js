/* What moves in a report: the figures are put in place, sliders read the table that
   rides in the file, one station is pointed at everywhere, tables are saved. */
(async () => {
  "use strict"
  const byId = (id) => document.getElementById(id)
  const content = (id) => JSON.parse(byId(id).textContent)
  const data = content("halfspan-data")
  const MINUS = "\u2212", NOT_FOUND = "not found"

  // ---- figures ------------------------------------------------------------
  const figures = content("halfspan-figures")
  await Bokeh.embed.embed_items(figures.docs, figures.items)
  const doc = Bokeh.documents[0]
  const model = (name) => doc.get_model_by_name(name)
  const feed = (name, columns) => {
    const source = model(name)
    if (source) source.data = columns
  }

  // ---- numbers as the page writes them ------------------------------------
  const written = (value, unit, figures = 3) => {
    if (!Number.isFinite(value)) return NOT_FOUND
    const size = Math.abs(value)
    const power = size > 0 ? Math.floor(Math.log10(Number(size.toPrecision(figures)))) : 0
    const digits = size.toFixed(Math.min(Math.max(figures - 1 - power, 0), 5))
    const sign = value < 0 && Number(digits) !== 0 ? MINUS : ""
    return sign + digits + (unit ? "\u00a0" + unit : "")
  }

  // ---- the table: cubics through four neighbours, as it was checked --------
  const weights = (axis, place) => {
    const at = (place - axis.first) / (axis.last - axis.first) * (axis.count - 1)
    const cell = Math.min(Math.max(Math.floor(at), 1), axis.count - 3)
    const x = at - cell, below = x + 1, above = x - 1, far = x - 2
    return [cell - 1, [-x * above * far / 6, below * above * far / 2,
      -below * x * far / 2, below * x * above / 6]]
  }
  const read = (axis, values, place) => {
    const [first, weight] = weights(axis, place)
    let sum = 0
    for (let k = 0; k < 4; k++) {
      if (values[first + k] === null) return NaN
      sum += weight[k] * values[first + k]
    }
    return sum
  }
  const read2 = (rows, columns, values) => {
    let sum = 0
    for (let i = 0; i < 4; i++) for (let j = 0; j < 4; j++) {
      const value = values[rows[0] + i][columns[0] + j]
      if (value === null) return NaN
      sum += rows[1][i] * columns[1][j] * value
    }
    return sum
  }
  const straight = (axis, values, place) => {
    const at = (place - axis.first) / (axis.last - axis.first) * (axis.count - 1)
    const cell = Math.min(Math.max(Math.floor(at), 0), axis.count - 2)
    const x = Math.min(Math.max(at - cell, 0), 1)
    return values[cell] * (1 - x) + values[cell + 1] * x
  }

  const flight = (one, speed, mass, altitude, whole) => {
    const table = one.table
    const density = read(table.altitude, table.density, altitude)
    const viscosity = read(table.altitude, table.viscosity, altitude)
    const weight = mass * data.live.gravity
    const area = 0.5 * density * speed * speed * table.area
    const place = Math.log(speed / viscosity)
    const share = weight / area / straight(table.log_speed, table.knee, place)
    const found = {share, trust: 3}
    if (whole) {
      const loaded = Math.log(weight / (density * viscosity * viscosity))
      const stall = table.stall.map((row) => Math.exp(read(table.log_weight, row, loaded)) * viscosity)
      found.stall = stall[1]
      found.speed_ratio = speed / stall[1]
      found.landing_ratio = one.landing / stall[1]
    }
    if (!(share <= 1) || place < table.log_speed.first - 1e-9) return found
    const rows = weights(table.share, share), columns = weights(table.log_speed, place)
    const part = (name) => area * read2(rows, columns, table.columns[name])
    found.induced = part("induced")
    found.profile = part("profile")
    found.body = area * table.body
    found.trim = part("trim_induced") + part("trim_profile")
    found.drag = found.induced + found.profile + found.body + found.trim
    found.lift_to_drag = weight / found.drag
    if (!whole) return found
    found.elevator = read2(rows, columns, table.columns.elevator_deg)
    found.power = found.drag * speed / one.drive.efficiency + one.drive.avionics_w
    const rated = one.drive.usable_energy_j / (found.power * 3600)
    found.endurance = Math.min(rated, rated ** one.drive.peukert_exponent)
    found.lift = table.lift.map((values) => read2(rows, columns, values))
    found.limit = table.limit.map((band) => band.map((row) => read(table.log_speed, row, place)))
    const near = (axis, value) => Math.floor((value - axis.first) / (axis.last - axis.first)
      * (axis.count - 1) + 1e-9)
    const clamp = (value, most) => Math.min(Math.max(value, 0), most)
    found.trust = 0
    for (const i of [0, 1]) for (const j of [0, 1]) {
      const row = clamp(near(table.share, share) + i, table.share.count - 1)
      const column = clamp(near(table.log_speed, place) + j, table.log_speed.count - 1)
      found.trust = Math.max(found.trust, table.trust[row][column])
    }
    return found
  }

  // ---- sliders -------------------------------------------------------------
  const live = data.live
  const input = (name) => byId("live-" + name)
  let station = 0.5

  const settings = () => ({
    speed: Number(input("speed").value),
    mass: Number(input("mass").value),
    altitude: Number(input("altitude").value),
  })
  const massOf = (one, now) => live.compares ? one.mass * (1 + now.mass / 100) : now.mass
  const heightOf = (one, now) => live.compares ? one.field + now.altitude : now.altitude
  const inside = (one, now) => {
    const reach = one.table.reach, slack = 1e-6
    const mass = massOf(one, now)
    return mass >= reach.mass[0] - slack && mass <= reach.mass[1] + slack
      && heightOf(one, now) >= reach.altitude[0] - slack && heightOf(one, now) <= reach.altitude[1] + slack
  }
  const TRUST = ["inside the sections' data", "extrapolated", "indicative only", NOT_FOUND]
  const words = (one, now, found) => {
    if (!inside(one, now)) return "outside the range solved for it"
    if (!(found.share <= 1)) return "no level flight: too slow, the wing stalls"
    return TRUST[found.trust]
  }
  const along = (places, values, share) => {
    const y = share * places[places.length - 1]
    let at = 1
    while (at < places.length - 1 && places[at] < y) at++
    const x = Math.min(Math.max((y - places[at - 1]) / (places[at] - places[at - 1]), 0), 1)
    return values[at - 1] * (1 - x) + values[at] * x
  }

  const sayOne = (at, one, now) => {
    const usable = inside(one, now)
    const found = usable ? flight(one, now.speed, massOf(one, now), heightOf(one, now), true) : {share: NaN}
    if (found.lift) {
      found.local_lift = along(one.table.y_m, found.lift, station)
      found.local_limit = along(one.table.y_m, found.limit[1], station)
    }
    for (const cell of document.querySelectorAll(`output[id^="live-${at}-"]`)) {
      const key = cell.id.slice(`live-${at}-`.length)
      cell.textContent = key === "trust" ? words(one, now, found)
        : written(found[key], cell.dataset.unit)
    }
    saySplit(byId(`live-${at}-split`), found)
    return found
  }
  const saySplit = (bar, found) => {
    bar.replaceChildren()
    if (!Number.isFinite(found.drag)) return
    for (const [name, said] of [["induced", "induced"], ["profile", "sections"],
      ["body", "body"], ["trim", "trim"]]) {
      const share = found[name] / found.drag
      const piece = document.createElement("span")
      piece.className = "piece " + name
      piece.style.flexGrow = String(Math.max(share, 0))
      piece.title = piece.textContent = `${said} ${Math.round(100 * share)} %`
      if (share > 0.005) bar.append(piece)
    }
  }

  const sweep = (one, now) => {
    const columns = {x: [], total: [], lift_to_drag: []}
    for (const part of ["body", "profile", "induced", "trim"]) {
      columns[part + "_low"] = []
      columns[part + "_high"] = []
    }
    if (!inside(one, now)) return columns
    const [low, high] = one.table.reach.speed
    for (let k = 0; k <= 80; k++) {
      const speed = low + (high - low) * k / 80
      const found = flight(one, speed, massOf(one, now), heightOf(one, now), false)
      if (!Number.isFinite(found.drag)) continue
      columns.x.push(speed)
      columns.total.push(found.drag)
      columns.lift_to_drag.push(found.lift_to_drag)
      let below = 0
      for (const part of ["body", "profile", "induced", "trim"]) {
        columns[part + "_low"].push(below)
        below += found[part]
        columns[part + "_high"].push(below)
      }
    }
    return columns
  }
  const stretch = (plot, values) => {
    const figure = model(plot)
    const finite = values.filter(Number.isFinite)
    if (!figure || !finite.length) return
    const most = Math.max(...finite), end = figure.y_range.end
    if (most > 0.97 * end || most < 0.45 * end) {
      const step = 10 ** Math.floor(Math.log10(most)) / 2
      figure.y_range.setv({start: 0, end: Math.ceil(1.15 * most / step) * step})
    }
  }

  const move = () => {
    if (!live) return
    const now = settings()
    for (const name of ["speed", "mass", "altitude"]) {
      const said = byId(`live-${name}-said`)
      const digits = name === "altitude" ? 0 : name === "speed" || live.compares ? 1 : 2
      const sign = live.compares && name !== "speed" && now[name] > 0 ? "+" : ""
      said.textContent = sign + now[name].toFixed(digits).replace("-", MINUS) + "\u00a0" + said.dataset.unit
      input(name).setAttribute("aria-valuetext", said.textContent)
    }
    byId("live-settings").textContent = ["speed", "mass", "altitude"].map((name) =>
      `${document.querySelector(`label[for=live-${name}]`).textContent.toLowerCase()} `
      + byId(`live-${name}-said`).textContent).join(", ")
    feed("live-speed-data", {x: [now.speed]})
    live.scenarios.forEach((one, at) => {
      const found = sayOne(at, one, now)
      const columns = sweep(one, now)
      if (live.compares) {
        feed(`live-${at}-data`, {x: columns.x, lift_to_drag: columns.lift_to_drag,
          share: columns.x, used: columns.x})
        const far = one.table.y_m[one.table.y_m.length - 1]
        feed(`live-${at}-along`, found.lift
          ? {share: one.table.y_m.map((y) => 100 * y / far),
            used: found.lift.map((lift, k) => lift / found.limit[1][k])}
          : {share: [], used: []})
      } else {
        const {lift_to_drag, ...drag} = columns
        feed("live-drag-data", drag)
        const least = Math.min(...columns.total)
        stretch("live-drag", columns.total.filter((value) => value < 2.6 * least))
        feed("live-lift-data", found.lift
          ? {x: one.table.y_m, lift: found.lift, low: found.limit[0], limit: found.limit[1],
            high: found.limit[2]}
          : {x: [], lift: [], low: [], limit: [], high: []})
      }
    })
    if (live.compares) {
      stretch("live-ratio", live.scenarios.flatMap((one) => sweep(one, now).lift_to_drag))
    }
    sayStation()
  }

  // The station moves no curve: only what is read at it.
  const moveStation = () => {
    if (live) live.scenarios.forEach((one, at) => sayOne(at, one, settings()))
    sayStation()
  }

  if (live) {
    for (const name of ["speed", "mass", "altitude"]) input(name).addEventListener("input", move)
    byId("live-reset").addEventListener("click", () => {
      for (const name of ["speed", "mass", "altitude"]) input(name).value = input(name).dataset.design
      move()
    })
  }

  // ---- one station for all --------------------------------------------------
  const marker = model("station"), table = model("stations")
  const slider = byId("station"), said = byId("station-said")
  const rows = [...document.querySelectorAll("table.stations tbody tr")]

  const sayStation = () => {
    slider.value = String(Math.round(100 * station))
    const place = live ? station * live.scenarios[0].table.y_m.at(-1) : NaN
    feed("live-station-data", {x: [data.stations.linked ? place : 100 * station]})
    if (!marker) {
      said.textContent = `${Math.round(100 * station)} % of each half-span`
      return
    }
    const row = Object.fromEntries(Object.entries(marker.data).map(([name, column]) => [name, column[0]]))
    said.textContent = `${written(row.y, "m")} from the centre, chord ${written(1000 * row.chord, "mm")}`
      + ` · landing: Re ${written(row.re_landing, "thousand")}, lift ${written(row.lift_landing, "")}`
      + ` of ${written(row.limit_landing, "")} · cruise: lift ${written(row.lift_cruise, "")}`
      + ` of ${written(row.limit_cruise, "")}`
    const near = [...table.data.y].indexOf(row.y)
    rows.forEach((one, at) => one.classList.toggle("here", at === near))
  }
  const point = (share) => {
    if (!marker) {
      station = share
      moveStation()
      return
    }
    const shares = [...table.data.share]
    let near = 0
    shares.forEach((value, at) => {
      if (Math.abs(value - share) < Math.abs(shares[near] - share)) near = at
    })
    const row = {held: [1]}
    for (const [name, column] of Object.entries(table.data)) row[name] = [column[near]]
    marker.data = row
  }
  slider.addEventListener("input", () => point(Number(slider.value) / 100))
  if (marker) {
    marker.connect(marker.properties.data.change, () => {
      station = marker.data.share[0]
      moveStation()
    })
    station = marker.data.share[0]
    rows.forEach((row, at) => row.addEventListener("click", () => point([...table.data.share][at])))
  }
  if (live) move()
  else sayStation()

  // ---- saving ----------------------------------------------------------------
  for (const button of document.querySelectorAll("button[data-csv]")) {
    button.addEventListener("click", () => {
      const file = data.csv[button.dataset.csv]
      const link = document.createElement("a")
      link.href = URL.createObjectURL(new Blob([file.text], {type: "text/csv;charset=utf-8"}))
      link.download = file.name
      link.click()
      setTimeout(() => URL.revokeObjectURL(link.href), 10_000)
    })
  }

  // ---- printing: figures keep what is drawn and are set smaller ---------------
  const PAGE = 700, GAP = 14
  const shrink = () => {
    document.querySelectorAll("details").forEach((one) => { one.open = true })
    for (const place of document.querySelectorAll(".plot")) {
      const drawn = place.firstElementChild
      const target = place.matches(".wide, .live:not(.many) .plot") ? PAGE : (PAGE - GAP) / 2
      const size = drawn.getBoundingClientRect()
      if (!size.width) continue
      drawn.style.setProperty("width", `${size.width}px`)
      drawn.style.setProperty("height", `${size.height}px`)
      drawn.style.setProperty("zoom", String(Math.min(target / size.width, 1)))
    }
  }
  const grow = () => {
    for (const drawn of document.querySelectorAll(".plot > div")) {
      for (const name of ["width", "height", "zoom"]) drawn.style.removeProperty(name)
    }
  }
  window.addEventListener("beforeprint", shrink)
  window.addEventListener("afterprint", grow)
  document.documentElement.dataset.ready = "true"
})()
