# Writes r_samples.csv and r_values.csv beside itself: what R's survival and cmprsk compute on open data sets.
# Run in this folder: Rscript r_values.R. Written with R 4.2.2, survival 3.5-3, cmprsk 2.2-11, splines 4.2.2.
suppressMessages({library(survival); library(cmprsk); library(splines)})

exactly <- coxph.control(eps = 1e-12, toler.chol = 1e-14, iter.max = 100)
quiet <- function(x) suppressWarnings(x)

set <- function(time, event, arm, stratum, x) {
  rows <- complete.cases(time, event, arm, stratum, x)
  data.frame(time, event = as.integer(event), arm = as.integer(arm), stratum = as.integer(stratum), x)[rows, ]
}
death <- subset(colon, etype == 2 & rx != "Lev")
sets <- list(
  aml = with(aml, set(time, status, x == "Maintained", seq_along(time) %% 2, seq_along(time) %% 5)),
  lung = with(lung, set(time, status == 2, sex == 2, pmin(ph.ecog, 2), age)),
  veteran = with(veteran, set(time, status, trt == 2, as.integer(celltype) - 1, karno)),
  ovarian = with(ovarian, set(futime, fustat, rx == 2, resid.ds - 1, age)),
  pbc = with(pbc[1:312, ], set(time, status == 2, trt == 1, edema > 0, log(bili))),
  kidney = with(kidney, set(time, status, sex == 2, disease == "GN", age)),
  colon = with(death, set(time, status, rx == "Lev+5FU", node4, age)),
  gbsg = with(gbsg, set(rfstime, status, hormon, grade == 3, pgr / 100)),
  rats = with(rats, set(time, status, rx, sex == "m", litter %% 3)),
  stanford2 = with(stanford2, set(time, status, t5 > 1, age > 45, age)),
  retinopathy = with(retinopathy, set(futime, status, trt, type == "adult", age)),
  mgus2 = with(mgus2, set(futime, death, sex == "M", hgb < 12, age))
)
samples <- do.call(rbind, lapply(names(sets), function(n) cbind(set = n, sets[[n]])))
num <- function(x) sprintf("%.17g", x)
samples$time <- num(samples$time); samples$x <- num(samples$x)
write.csv(samples, "r_samples.csv", row.names = FALSE, quote = FALSE)

values <- list()
put <- function(name, what, x) {
  x <- as.numeric(x)
  values[[length(values) + 1]] <<- data.frame(set = name, what = what, index = seq_along(x) - 1, value = num(x))
}
kinds <- c(plain = "plain", log = "log", `log-log` = "log-log", logit = "logit", `arcsine-square-root` = "arcsin")

for (name in names(sets)) {
  d <- sets[[name]]
  y <- with(d, Surv(time, event))
  for (side in 0:1) {
    tag <- function(what) paste0(what, ".arm", side)
    one <- survfit(y ~ 1, data = d, subset = arm == side, se.fit = TRUE)
    at <- unique(round(quantile(which(one$n.event > 0), c(0, 0.2, 0.4, 0.6, 0.8, 1), type = 1)))
    put(name, tag("time"), one$time[at])
    put(name, tag("at_risk"), one$n.risk[at])
    put(name, tag("survival"), one$surv[at])
    put(name, tag("std_error"), (one$surv * one$std.err)[at])
    put(name, tag("hazard"), one$cumhaz[at])
    put(name, tag("hazard_std_error"), one$std.chaz[at])
    for (kind in names(kinds)) {
      limits <- survfit(y ~ 1, data = d, subset = arm == side, conf.type = kinds[kind])
      put(name, tag(paste0("ci_low.", kind)), limits$lower[at])
      put(name, tag(paste0("ci_high.", kind)), limits$upper[at])
      for (share in c(0.25, 0.5)) {
        q <- quantile(limits, share)
        put(name, tag(paste0("quantile.", share, ".", kind)), unlist(q))
      }
    }
    tau <- min(tapply(d$time, d$arm, max)) * 0.8
    mean <- summary(one, rmean = tau)$table
    put(name, tag("restricted_mean"), c(tau, mean["rmean"], mean["se(rmean)"]))
    follow <- with(d[d$arm == side, ], survfit(Surv(time, 1 - event) ~ 1))
    put(name, tag("follow_up"), quantile(follow, 0.5)$quantile)
  }
  for (rho in c(0, 1)) {
    test <- survdiff(y ~ arm, data = d, rho = rho)
    put(name, paste0("logrank.rho", rho), c(test$obs[2], test$exp[2], test$var[2, 2], test$chisq))
  }
  test <- survdiff(y ~ arm + strata(stratum), data = d)
  put(name, "logrank.stratified", c(sum(test$obs[2, ]), sum(test$exp[2, ]), test$var[2, 2], test$chisq))
  test <- survdiff(y ~ interaction(arm, stratum, drop = TRUE), data = d)
  put(name, "groups", c(test$chisq, length(test$n) - 1, test$obs, test$exp))
  trend <- quiet(coxph(y ~ stratum, data = d, ties = "exact", control = exactly))
  put(name, "trend", trend$score)
  for (ties in c("efron", "breslow", "exact")) {
    fit <- quiet(coxph(y ~ arm + strata(stratum), data = d, ties = ties, control = exactly))
    put(name, paste0("cox.", ties), c(fit$coefficients, sqrt(fit$var[1, 1])))
    fit <- quiet(coxph(y ~ arm + x + strata(stratum), data = d, ties = ties, control = exactly))
    put(name, paste0("model.", ties), c(fit$coefficients, fit$var, fit$loglik, fit$score, fit$wald.test))
  }
  fit <- quiet(coxph(y ~ arm + x, data = d, control = exactly))
  base <- basehaz(fit, centered = TRUE)
  put(name, "baseline", c(fit$means["x"], base$time[nrow(base)], base$hazard[nrow(base)]))
  plain <- quiet(coxph(y ~ arm, data = d, control = exactly))
  strat <- quiet(coxph(y ~ arm + strata(stratum), data = d, control = exactly))
  for (transform in c("identity", "log", "rank", "km")) {
    put(name, paste0("proportionality.", transform), cox.zph(plain, transform = transform)$table[1, c(1, 3)])
    put(name, paste0("proportionality.stratified.", transform), cox.zph(strat, transform = transform)$table[1, 1])
    put(name, paste0("proportionality.model.", transform), cox.zph(fit, transform = transform)$table[, 1])
  }
  z <- cox.zph(plain)
  order_of_time <- order(z$time)
  put(name, "residuals", c(z$x[order_of_time][1:6], z$y[order_of_time, 1][1:6]))
  put(name, "residual_sum", sum(z$y))
  smooth <- lm(y ~ ns(x, df = 3), data = data.frame(y = z$y[, 1], x = z$x))
  at <- data.frame(x = seq(min(z$x), max(z$x), length.out = 40))
  shown <- predict(smooth, at, se.fit = TRUE)
  put(name, "smooth", shown$fit[c(1, 10, 20, 30, 40)])
  band <- shown$se.fit / summary(smooth)$sigma * sqrt(vcov(plain)[1, 1] * sum(d$event))
  put(name, "smooth_std_error", band[c(1, 10, 20, 30, 40)])
  cut <- as.numeric(quantile(d$time[d$event == 1], 0.5, type = 1))
  split <- survSplit(Surv(time, event) ~ ., d, cut = cut, episode = "period")
  for (period in 1:2) {
    part <- quiet(coxph(Surv(tstart, time, event) ~ arm, split[split$period == period, ], control = exactly))
    put(name, paste0("period", period), c(cut, part$coefficients, sqrt(part$var[1, 1])))
  }
  alike <- quiet(coxph(y ~ arm + factor(stratum), data = d, control = exactly))
  apart <- quiet(coxph(y ~ arm * factor(stratum), data = d, control = exactly))
  put(name, "interaction", c(2 * (apart$loglik[2] - alike$loglik[2]), length(apart$coefficients) - length(alike$coefficients)))
}

months <- with(mgus2, ifelse(pstat == 0, futime, ptime))
cause <- with(mgus2, ifelse(pstat == 0, 2 * death, 1))
men <- as.integer(mgus2$sex == "M")
old <- as.integer(cut(mgus2$age, c(0, 60, 70, 80, 200))) - 1
write.csv(data.frame(months, cause, men, old), "r_causes.csv", row.names = FALSE)
many <- survfit(Surv(months, factor(cause, 0:2)) ~ 1)
at <- summary(many, times = c(12, 60, 120, 240, 360))
for (of in 1:2) {
  put("mgus2", paste0("incidence.", of), at$pstate[, of + 1])
  put("mgus2", paste0("incidence_std_error.", of), at$std.err[, of + 1])
}
put("mgus2", "gray.two", cuminc(months, cause, men)$Tests[, 1])
put("mgus2", "gray.four", cuminc(months, cause, old)$Tests[, 1])
put("mgus2", "gray.stratified", cuminc(months, cause, men, old)$Tests[, 1])

write.csv(do.call(rbind, values), "r_values.csv", row.names = FALSE, quote = FALSE)
