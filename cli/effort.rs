//! Solving the points of a table: in parallel, each result saved at once, resumed from what is there.

use std::io::Write;
use std::path::Path;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::{Mutex, PoisonError};
use std::time::Instant;

use rayon::ThreadPool;
use tiltgap_solver::{assess, Params};

use crate::error::Error;
use crate::interrupt;
use crate::progress::Line;
use crate::store::{save, text, Format, Part};
use crate::table_job::TableJob;
use crate::tables::axis::Variable;
use crate::tables::fit::{Campaign, Verdict};
use crate::tables::plan::{place, Point};
use crate::tables::quantity::{Quantity, Sample};
use crate::tables::space::{described, Space};
use crate::tables::table::Table;

/// The work on a table or a share of one.
pub struct Effort<'a> {
    /// What for.
    pub job: &'a TableJob,
    /// Its poses.
    pub space: Space,
    /// Its numbers.
    pub quantities: Vec<Quantity>,
    /// Which share, if not all.
    pub part: Option<Part>,
    /// Settings of the solver.
    pub params: Params,
    /// Where the progress is saved; nowhere if the table goes to standard output.
    pub progress: Option<&'a Path>,
    /// What is solved.
    pub campaign: Campaign,
}

/// Progress as it is shown: a line that is rewritten on a terminal, and a line for each finished row elsewhere.
struct News<'a> {
    line: Line<'a>,
    begun: Instant,
    done: usize,
    all: usize,
}

impl News<'_> {
    fn left(&self) -> String {
        let seconds =
            self.begun.elapsed().as_secs_f64() / self.done.max(1) as f64 * (self.all - self.done) as f64;
        match seconds {
            s if s >= 5400.0 => format!("about {:.1} h left", s / 3600.0),
            s if s >= 90.0 => format!("about {:.0} min left", s / 60.0),
            s => format!("about {s:.0} s left"),
        }
    }
}

/// What a row of points is: the nodes with the same number on the first axis, or the checks.
fn row(point: &Point) -> Option<usize> {
    match point {
        Point::Node(numbers) => Some(numbers[0]),
        Point::Check(_) => None,
    }
}

impl Effort<'_> {
    fn variables(&self) -> Vec<Variable> {
        self.space.axes.iter().map(|a| a.span.variable).collect()
    }

    /// What is left of the share (or of all) with the present plan.
    pub fn missing(&self) -> Vec<Point> {
        let mut points = self.campaign.plan.points();
        if let Some(part) = self.part {
            points = part.of_points(points);
        }
        points.retain(|p| !self.campaign.samples.contains_key(p));
        points
    }

    fn solve(&self, point: &Point, threads: usize) -> Result<Sample, Error> {
        let at = place(&self.space.axes, point);
        let question = self.space.question_at(&at);
        let memory_bytes = self.params.memory_bytes / threads as u64;
        let solved = assess(&question, &Params { memory_bytes, ..self.params }, &mut |_| {});
        let assessment = solved.map_err(|error| Error::Pose {
            place: described(&self.variables(), &at),
            error: Box::new(error.into()),
        })?;
        Ok(Sample::new(&self.quantities, &assessment, question.arrangement.size_m()))
    }

    fn save(&self, campaign: &Campaign) -> Result<(), Error> {
        let Some(path) = self.progress else { return Ok(()) };
        save(path, &text(Format::Progress, self.job, &self.space, self.part, campaign, None)?)
    }

    /// Solves what is missing. `pool` computes, one point for each of its threads at a time.
    ///
    /// # Errors
    /// The first point that fails, an interruption, or a progress that cannot be saved; what is done is saved.
    pub fn round(
        &mut self,
        pool: &ThreadPool,
        stderr: &mut (dyn Write + Send),
        terminal: bool,
    ) -> Result<(), Error> {
        let points = self.missing();
        let threads = pool.current_num_threads();
        let next = AtomicUsize::new(0);
        let failed = AtomicUsize::new(usize::MAX);
        let news =
            News { line: Line::new(stderr, terminal), begun: Instant::now(), done: 0, all: points.len() };
        let shared = Mutex::new((self.campaign.clone(), news, Ok(())));
        let lock = || shared.lock().unwrap_or_else(PoisonError::into_inner);
        let this = &*self;
        std::thread::scope(|scope| {
            for _ in 0..threads.min(points.len()) {
                scope.spawn(|| loop {
                    let n = next.fetch_add(1, Ordering::SeqCst);
                    if n >= points.len() || interrupt::asked() || n > failed.load(Ordering::SeqCst) {
                        return;
                    }
                    let solved = pool.install(|| this.solve(&points[n], threads));
                    let mut guard = lock();
                    let (campaign, news, outcome) = &mut *guard;
                    let saved = solved.and_then(|sample| {
                        campaign.samples.insert(points[n].clone(), sample);
                        this.save(campaign)
                    });
                    news.done += 1;
                    match saved {
                        Ok(()) => this.tell(news, &points, n, campaign),
                        // Of several failures the first in order counts, so that every run tells the same.
                        Err(error) if n < failed.load(Ordering::SeqCst) => {
                            failed.store(n, Ordering::SeqCst);
                            *outcome = Err(error);
                        }
                        Err(_) => {}
                    }
                });
            }
        });
        let (campaign, news, outcome) = shared.into_inner().unwrap_or_else(PoisonError::into_inner);
        drop(news);
        self.campaign = campaign;
        outcome?;
        let left = self.missing().len();
        if left > 0 {
            let done = points.len() - left;
            let progress = self.progress.map(Path::to_path_buf);
            return Err(Error::Interrupted { done, all: points.len(), progress });
        }
        Ok(())
    }

    fn tell(&self, news: &mut News, points: &[Point], n: usize, campaign: &Campaign) {
        let count = format!("{} of {} points, {}", news.done, news.all, news.left());
        if news.line.is_shown() {
            news.line.write(&count);
            return;
        }
        let mine = row(&points[n]);
        let finished = points.iter().filter(|p| row(p) == mine).all(|p| campaign.samples.contains_key(p));
        if finished {
            let name = match mine {
                Some(_) => {
                    let at = place(&self.space.axes, &points[n]);
                    described(&self.variables()[..1], &at[..1])
                }
                None => "check points".into(),
            };
            news.line.plain(&format!("{name}: done; {count}"));
        }
    }

    /// Rounds until the interpolated factors are within the accuracy, and the table.
    ///
    /// # Errors
    /// As [`Effort::round`], or [`Error::NotInterpolated`].
    pub fn finish(
        &mut self,
        pool: &ThreadPool,
        stderr: &mut (dyn Write + Send),
        terminal: bool,
    ) -> Result<Table, Error> {
        loop {
            self.round(pool, stderr, terminal)?;
            match self.campaign.verdict(&self.space, &self.quantities, self.job.accuracy) {
                Verdict::Good => {
                    return Ok(Table::new(self.space.clone(), self.quantities.clone(), &self.campaign))
                }
                Verdict::Grow(axis) => self.campaign.plan.nodes[axis] += 1,
                Verdict::Exhausted(worst) => {
                    return Err(Error::NotInterpolated { asked: self.job.accuracy, worst })
                }
            }
        }
    }
}
